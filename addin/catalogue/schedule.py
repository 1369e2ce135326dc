"""Row of the schedule of fittings."""

from __future__ import annotations

from ..blocks.schedule import Schedule
from . import ends, fittings
from .types import Arg, Result, Row, TableLonghand

FAMILY = "Blocks"

_SINGLE = {row.name: row for row in (*fittings.ROWS, *ends.ROWS)}
KINDS = {
    "bend": _SINGLE["TB_BEND"],
    "reducer": _SINGLE["TB_REDUCER"],
    "tee": _SINGLE["TB_TEE"],
    "nozzle": _SINGLE["TB_NOZZLE"],
    "closed": _SINGLE["TB_CLOSED"],
    "inline": _SINGLE["TB_INLINE"],
    "straight": _SINGLE["TB_STRAIGHT"],
}
"""What may stand in the column "fitting", and the function that works it."""

_RESULTS = (
    Result(name="name", role="text", text="name of the fitting"),
    Result(name="fitting", role="text", text="kind of fitting"),
    Result(name="Fx", role="force", text="thrust of the fluid along the incoming pipe"),
    Result(name="Fy", role="force", text="thrust across it, towards the side to which the outlet turns"),
    Result(name="F", role="force", text="thrust, magnitude"),
    Result(name="dir", role="angle", text="direction of the thrust, from x towards y"),
    Result(name="Rx", role="force", text="reaction of the restraint along x, opposite to Fx"),
    Result(name="Ry", role="force", text="reaction of the restraint along y, opposite to Fy"),
    Result(name="V1", role="velocity", text="velocity at section 1"),
    Result(name="V2", role="velocity", text="velocity at section 2; empty where there is none"),
    Result(name="p2", role="pressure", text="gauge pressure at section 2; empty where there is none"),
    Result(name="note", role="text", text="warnings, or why the row has no result"),
)
_READER = Schedule(KINDS, _RESULTS)

ROWS = (
    Row(
        name="TB_SCHEDULE",
        family=FAMILY,
        summary="Thrust on a table of unrelated fittings, one a row: bends, reducers, tees, nozzles, "
        "closed ends, in-line restrictions and straight pipes.",
        kind="table",
        block=True,
        args=(
            Arg(
                name="headings",
                role="headings",
                text="column headings; a unit in brackets, or in a second row, where it differs from the set",
            ),
            Arg(
                name="table",
                role="table",
                text="one fitting a row; a cell left empty means what it means in the single function",
                columns=_READER.columns,
            ),
        ),
        results=_RESULTS,
        routine=_READER,
        sign="Plane fittings: x along the incoming flow, y towards the side to which the outlet turns. "
        "F is the thrust of the fluid on the fitting, R the reaction of the restraint, its opposite.",
        longhand=TableLonghand(rows=()),  # every row has the working of its fitting's own function
        reference="Each row as the function of its fitting: TB_BEND, TB_REDUCER, TB_TEE, TB_NOZZLE, "
        "TB_CLOSED, TB_INLINE, TB_STRAIGHT",
        example='TB_SCHEDULE("F", "metric", {"fitting","rho","D1","p1","Q","theta"}, '
        '{"bend",1000,300,400,120,90;"closed",1000,200,400,0,""})',
    ),
)
