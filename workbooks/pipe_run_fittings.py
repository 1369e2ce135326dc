"""The sheet Fittings of the template ``pipe-run``: some nodes again, each by its own function."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final, NamedTuple

from openpyxl.formatting.rule import CellIsRule
from openpyxl.styles import PatternFill
from openpyxl.worksheet.worksheet import Worksheet

from . import layout

RHO: Final = "INDEX(Start,1,2)"


class Given(NamedTuple):
    """An input of a fitting: from the results of the run, or from the inputs of a node."""

    symbol: str
    text: str
    unit: str
    source: str
    """ "run" or "input". """
    column: str
    offset: int = 0


class Wanted(NamedTuple):
    """A result of a fitting, and the column of the run to compare it with ("" for none)."""

    text: str
    unit: str
    formula: str
    compare: str


def _pipe(symbol: str = "D1", offset: int = 0, text: str = "inside diameter") -> Given:
    return Given(symbol, text, "mm", "input", "D", offset)


_P1: Final = Given("p1", "gauge pressure arriving", "kPa", "run", "p1")
_Q: Final = Given("Q", "flow", "L/s", "run", "Q2")
_K: Final = Given("K", "loss coefficient", "", "input", "K")
_BEND: Final = "Units,{rho},{D1},{p1},{Q},{theta},,{K}"
_TEE: Final = "Units,{rho},{D1},{p1},{Q1},{D3},{Q3},90,,,,,,{p2},{p3}"

FITTINGS: Final[tuple[tuple[str, str, tuple[Given, ...], tuple[Wanted, ...]], ...]] = (
    (
        "N05",
        "horizontal bend",
        (_pipe(), _P1, _Q, Given("theta", "deflection", "deg", "run", "theta"), _K),
        (
            Wanted("thrust, magnitude", "kN", f'TB_BEND("F",{_BEND})', "F"),
            Wanted("pressure leaving", "kPa", f'TB_BEND("p2",{_BEND})', "p2"),
            Wanted("velocity", "m/s", "TB_VELOCITY(Units,{Q},{D1})", "V2"),
            Wanted("remark", "", f'TB_WHY("TB_BEND","F",{_BEND})', ""),
        ),
    ),
    (
        "N14",
        "tee with offtake",
        (
            _pipe(),
            _P1,
            Given("Q1", "flow arriving", "L/s", "run", "Q1"),
            Given("D3", "diameter of the branch", "mm", "input", "Do"),
            Given("Q3", "flow of the branch", "L/s", "input", "Qo"),
            Given("p2", "gauge pressure leaving", "kPa", "run", "p2"),
            Given("p3", "gauge pressure in the branch", "kPa", "run", "po"),
        ),
        (
            Wanted("thrust, magnitude", "kN", f'TB_TEE("F",{_TEE})', "F"),
            Wanted("flow that goes on", "L/s", f'TB_TEE("Q2",{_TEE})', "Q2"),
        ),
    ),
    (
        "N15",
        "reducer",
        (_pipe(offset=-1), _pipe("D2", text="diameter leaving"), _P1, _Q, _K),
        (
            Wanted("thrust", "kN", 'TB_REDUCER("F",Units,{rho},{D1},{D2},{p1},{Q},{K})', "F"),
            Wanted("pressure leaving", "kPa", 'TB_REDUCER("p2",Units,{rho},{D1},{D2},{p1},{Q},{K})', "p2"),
        ),
    ),
    (
        "N16",
        "blank branch",
        (
            Given("D", "diameter of the branch", "mm", "input", "Do"),
            Given("p", "gauge pressure", "kPa", "run", "po"),
        ),
        (Wanted("thrust", "kN", 'TB_CLOSED("F",Units,{D},{p})', "F"),),
    ),
    (
        "N20",
        "control valve",
        (_pipe("D"), _P1, _Q, _K),
        (
            Wanted("thrust", "kN", 'TB_INLINE("F",Units,{rho},{D},{p1},{Q},{K})', "F"),
            Wanted("pressure leaving", "kPa", 'TB_INLINE("p2",Units,{rho},{D},{p1},{Q},{K})', "p2"),
        ),
    ),
    (
        "N24",
        "outlet nozzle",
        (_pipe(offset=-1), _pipe("D2", text="diameter of the nozzle"), _Q),
        (
            Wanted("thrust on the nozzle", "kN", 'TB_NOZZLE("F",Units,{rho},{D1},{D2},,{Q})', "F"),
            Wanted("pressure before it", "kPa", 'TB_NOZZLE("p1",Units,{rho},{D1},{D2},,{Q})', "p1"),
        ),
    ),
)


def fittings(ws: Worksheet, node: Callable[[str, str], str], given: Callable[[str, str, int], str]) -> None:
    """Fill the sheet; ``node`` and ``given`` make the formulas that look up results and inputs."""
    layout.heading(
        ws, "Some nodes again, cell by cell", "Each fitting by its own function, compared with the run."
    )
    layout.head_row(ws, 3, 1, ("input", "value", "unit", "result", "value", "unit", "TB_RUN", ""))
    row = 4
    for name, title, inputs, results in FITTINGS:
        layout.section(ws, row, f"{name}, {title}")
        top = row + 1
        place = {"rho": RHO}
        for i, item in enumerate(inputs, top):
            place[item.symbol] = f"$B${i}"
            formula = (
                node(name, item.column) if item.source == "run" else given(name, item.column, item.offset)
            )
            layout.put(ws, f"A{i}", f"{item.symbol}, {item.text}")
            layout.put(ws, f"B{i}", formula, "Calculation", "0.000")
            layout.put(ws, f"C{i}", item.unit)
        for i, result in enumerate(results, top):
            layout.put(ws, f"D{i}", result.text)
            layout.put(ws, f"E{i}", "=" + result.formula.format(**place), "Output", "0.000")
            layout.put(ws, f"F{i}", result.unit)
            if result.compare:
                layout.put(ws, f"G{i}", node(name, result.compare), "Calculation", "0.000")
                agreement = f'=IF(ABS(E{i}-G{i})<=1E-9*ABS(G{i})+1E-9,"agrees","differs")'
                layout.put(ws, f"H{i}", agreement, "Check Cell")
        row = top + max(len(inputs), len(results)) + 1
    red = PatternFill(start_color="00FFC7CE", end_color="00FFC7CE", fill_type="solid")
    ws.conditional_formatting.add(f"H4:H{row}", CellIsRule(operator="equal", formula=['"differs"'], fill=red))
    layout.repeat_rows(ws, 3, 3)
    layout.freeze(ws, "A4")
