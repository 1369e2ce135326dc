"""The working of one table: entries and single steps on top, then a row for each row of the table."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from ..catalogue.types import Result, RowStep, TableLonghand
from ..xlsx.a1 import column_letters
from .convert import ANGLE_SCALE, P_ATM, Conversion, agreement, from_si, to_si, with_ambient
from .grid import Formula, Link, fixed, local
from .placed import FORMULA_TO, SUFFIX, TEXT_FROM, TEXT_TO, Entry, Placed, TableLine
from .rows import NARROW, column_breaks, worst
from .symbols import fill, inside, names_in, shown, si_unit

_LOWER: Final = ("fluid", "at", "flow_at", "start", "end", "method", "kind", "cat", "ckind")

__all__ = ["Entry", "Section", "TableLine", "unknown_names"]


@dataclass(slots=True, eq=False)
class Section(Placed):
    """A table's working, put on its sheet."""

    def write(self, tolerance: str) -> None:
        """Put the section on its sheet."""
        sheet = self.sheet
        sheet.widths |= {1: 16.0, 2: 14.0}
        sheet.line(self.top, [self.caption, "", *[""] * (self._verdict - 2)], "block")
        sheet.links.append(Link(self.top, 1, self.target))
        if self.entries:
            self._write_entries()
        self._write_singles(tolerance)
        self._write_head()
        for i, line in enumerate(self.lines):
            self._write_line(i, line, tolerance)
        self._write_verdict()

    def _write_entries(self) -> None:
        sheet = self.sheet
        at = min(self._entry_at.values()) - 1
        sheet.line(
            at, ["entry", "in SI", "as given", "unit", "factor to SI", "SI unit", "meaning"], "headnote"
        )
        for entry in self.entries:
            at = self._entry_at[entry.name]
            content = entry.content()
            sheet.put(at, 1, entry.name)
            if content is not None:
                content = with_ambient(content, self._ambient)
                sheet.put(at, 3, content, "linked" if isinstance(content, Formula) else "number")
            numeric = entry.role != "text"
            if numeric:
                sheet.put(at, 4, entry.conversion.unit, "note")
                sheet.put(at, 5, entry.conversion.factor, "factor")
                sheet.put(at, 6, si_unit(entry.role), "note")
            sheet.put(at, 7, entry.text, "note")
            ambient = P_ATM if entry.name == "pamb" else self._ambient
            formula = self._in_use(
                entry.name, entry.role, local(at, 3), local(at, 5), entry.conversion, ambient
            )
            sheet.put(at, 2, Formula(formula), "number")

    def _in_use(self, name: str, role: str, raw: str, factor: str, unit: Conversion, ambient: str) -> str:
        """The value of an entry or a cell in the working: SI, its default put in, its range kept."""
        empty = self.working.defaults.get(name, '""')
        if role == "text":
            value = f"LOWER(TRIM({raw}))" if name in _LOWER else f'TRIM({raw}&"")'
        else:
            si = to_si(raw, factor, unit, ambient)
            test = inside(self.working.bounds.get(name), f"({si})")
            value = f"IF({test},{si},#NUM!)" if test else si
        return f'IF({raw}="",{empty},{value})'

    def _write_singles(self, tolerance: str) -> None:
        sheet = self.sheet
        steps = self.working.single
        if steps:
            at = self._single_at[steps[0].symbol]
            sheet.line(at - 1, ["step", "value", "unit", "meaning"], "headnote")
            sheet.line(at - 1, ["formula"], "headnote", TEXT_TO + 1)
        for step in steps:
            at = self._single_at[step.symbol]
            sheet.put(at, 1, step.symbol)
            sheet.put(at, 2, Formula(fill(step.formula, lambda n: self._cell(n, None))), "number")
            sheet.put(at, 3, si_unit(step.role), "note")
            sheet.spread(at, TEXT_FROM, TEXT_TO, step.text, "wrapped")
            sheet.spread(at, TEXT_TO + 1, FORMULA_TO, shown(step.formula), "mono")
        for name, at in self._result_at.items():
            self._write_single_result(name, at, tolerance)

    def _write_single_result(self, name: str, at: int, tolerance: str) -> None:
        sheet = self.sheet
        result, unit = self.results[name]
        value = self._cell(self.working.results.get(name, name), None)
        sheet.put(at, 1, name, "resulttext")
        sheet.put(at, 4, unit.unit, "resulttext")
        sheet.put(at, 5, unit.factor, "result")
        sheet.put(at, 2, Formula(from_si(value, fixed(at, 5), unit, self._ambient)), "result")
        own = self.own.get(name)
        if own is not None:
            sheet.put(at, 3, Formula(own), "linked")
            verdict = agreement(local(at, 2), local(at, 3), tolerance, self._single_scale(result))
            sheet.put(at, 6, Formula(f"{local(at, 2)}-{local(at, 3)}"), "difference")
            sheet.put(at, 7, Formula(verdict), "verdict")
            sheet.verdicts.append(local(at, 7))
        head = ["result", "value", "in the cell", "unit", "factor to SI", "difference", "verdict"]
        if at - 1 not in self._result_at.values():
            sheet.line(at - 1, list(head), "headnote")

    def _single_scale(self, result: Result) -> str:
        """A closure is a ratio to the forces already: it agrees where both are nothing against 1."""
        if result.role == "ratio":
            return "1000000"
        same = [fixed(self._single_at[s.symbol], 2) for s in self.working.single if s.role == result.role]
        columns = [c.name for c, _ in self.columns if c.role == result.role]
        same += [cell for name in columns for cell in (self._cell(f"{name}.column", None),)]
        sizes = [f"MAX({cell}),0-MIN({cell})" for cell in same]
        return f"MAX({','.join(sizes)})/{fixed(self._result_at[result.name], 5)}" if sizes else ""

    def _write_head(self) -> None:
        sheet, at = self.sheet, self._head
        for i, text in enumerate(("symbol", "meaning", "unit", "formula", "unit given", "factor to SI")):
            sheet.put(at + i, 1, text, "headnote" if i < 4 else "note")
        for i in range(4):
            sheet.put(at + i, 2, "cell" if i == 0 else "", "head")
        for column, conversion in self.columns:
            raw, col = self._raw[column.name], self._column[column.name]
            self._head_column(raw, column.name, column.text, "as given", "input")
            bound = self.working.bounds.get(column.name)
            allowed = "" if bound is None or str(bound) == "any number" else str(bound)
            self._head_column(col, column.name, "in SI units", si_unit(column.role), allowed)
            if column.role != "text":
                sheet.put(at + 4, raw, conversion.unit, "note")
                sheet.put(at + 5, raw, conversion.factor, "factor")
        for step in self.working.rows:
            col = self._column[step.symbol]
            self._head_column(col, step.symbol, step.text, si_unit(step.role), _formulas(step))
            sheet.widths[col] = max(NARROW, min(30.0, len(_formulas(step)) / 5))
        for name, col in self._result.items():
            result, conversion = self.results[name]
            symbol = self.working.results.get(name, name)
            self._head_column(col, name, result.text, "of the cell", symbol)
            self._head_column(col + 1, name, "value in the cell", "", "")
            if result.role != "text":
                sheet.put(at + 4, col, conversion.unit, "note")
                sheet.put(at + 5, col, conversion.factor, "factor")
                self._head_column(col + 2, name, "difference", "", "")
            last = col + (2 if result.role == "text" else 3)
            self._head_column(last, name, "verdict", "", "")
            sheet.widths[last] = 9.0
        self._head_column(self._verdict, "", "the whole row", "", "")
        sheet.widths[self._verdict] = 9.0
        sheet.heights |= {at + 1: 80.0, at + 3: 104.0}
        sheet.column_breaks = column_breaks(sheet.widths, self._verdict)

    def _head_column(self, col: int, symbol: str, meaning: str, unit: str, formula: str) -> None:
        sheet, at = self.sheet, self._head
        for i, text in enumerate((symbol, meaning, unit)):
            sheet.put(at + i, col, text, "head")
        sheet.put(at + 3, col, formula, "headmono")
        sheet.widths.setdefault(col, NARROW)

    def _write_line(self, i: int, line: TableLine, tolerance: str) -> None:
        sheet, at = self.sheet, self._first + i
        sheet.put(at, 1, line.label)
        if line.target:
            sheet.put(at, 2, line.target.rpartition("!")[2], "link")
            sheet.links.append(Link(at, 2, line.target))
        given = line.given()
        for column, conversion in self.columns:
            raw = self._raw[column.name]
            content = given.get(column.name)
            if content is not None:
                content = with_ambient(content, self._ambient)
                sheet.put(at, raw, content, "linked" if isinstance(content, Formula) else "number")
            formula = self._in_use(
                column.name,
                column.role,
                local(at, raw),
                fixed(self._head + 5, raw),
                conversion,
                self._ambient,
            )
            sheet.put(at, self._column[column.name], Formula(formula), "number")
        for step in self.working.rows:
            formula = step.formula
            if i == 0 and step.first:
                formula = step.first
            elif i == len(self.lines) - 1 and step.last:
                formula = step.last
            text = fill(formula, lambda n: self._cell(n, at))
            sheet.put(at, self._column[step.symbol], Formula(text), "number")
        verdicts = [self._write_result(at, name, line, tolerance) for name in self._result]
        found = [v for v in verdicts if v]
        if found:
            sheet.put(at, self._verdict, Formula(worst(found)), "verdict")

    def _write_result(self, at: int, name: str, line: TableLine, tolerance: str) -> str:
        """One result of a row beside the cell that shows it; the cell of the verdict comes back."""
        sheet, col = self.sheet, self._result[name]
        result, conversion = self.results[name]
        value = self._cell(self.working.results.get(name, name), at)
        own = line.own.get(name)
        if result.role == "text":
            sheet.put(at, col, Formula(value), "resulttext")
            if own is None:
                return ""
            sheet.put(at, col + 1, Formula(f'{own}&""'), "linkedtext")
            same = f'IF(EXACT({local(at, col)},{local(at, col + 1)}),"agrees","differs")'
            sheet.put(at, col + 2, Formula(same), "verdict")
            return local(at, col + 2)
        unit = fixed(self._head + 5, col)
        converted = from_si(value, unit, conversion, self._ambient)
        sheet.put(at, col, Formula(f'IF({value}="","",{converted})'), "result")
        if own is None:
            return ""
        sheet.put(at, col + 1, Formula(own), "linked")
        a, b = local(at, col), local(at, col + 1)
        sheet.put(at, col + 2, Formula(f'IF(OR({a}="",{b}=""),"",{a}-{b})'), "difference")
        verdict = agreement(a, b, tolerance, self._scale(result, at, unit))
        empty = f'IF({b}="",IF({a}="","agrees","differs"),{verdict})'
        sheet.put(at, col + 3, Formula(f"IF(ISERROR({b}),{verdict},{empty})"), "verdict")
        return local(at, col + 3)

    def _scale(self, result: Result, at: int, unit: str) -> str:
        """The largest of the quantities of the same kind on the row."""
        like = {"force": ("M1", "M2", "Mo"), "pressure": ("p1", "p2"), "level": ("EGL1",), "head": ("EGL1",)}
        if result.role == "angle":
            return f"{ANGLE_SCALE}/{unit}"
        names = [n for n in like.get(result.role, ()) if n in self._column]
        if result.role == "flow":
            flows = [self._cell(column.name, at) for column, _ in self.columns if column.role == "flow"]
            return f"MAX({','.join(flows)},0-MIN({','.join(flows)}))/{unit}" if flows else ""
        sizes = [f"ABS({self._cell(n, at)})" for n in names]
        if "EGL1" in self._column and result.role in ("pressure", "force"):
            # A pressure is what is left of two levels; one metre of water is about 10 kPa.
            head = f"10000*ABS({self._cell('EGL1', at)})"
            area = f"*MAX({self._cell('A1', at)},{self._cell('A2', at)})" if result.role == "force" else ""
            sizes.append(head + area)
        if not sizes:
            return ""
        return f"MAX({','.join(sizes)})/{unit}"

    def _write_verdict(self) -> None:
        sheet = self.sheet
        areas = [fixed(at, 7) for name, at in self._result_at.items() if name in self.own]
        mark = column_letters(self._verdict)
        if self._result and self.lines:
            areas.append(f"${mark}${self._first}:${mark}${self._last}")
            for name, col in self._result.items():
                last = column_letters(col + (2 if self.results[name][0].role == "text" else 3))
                sheet.verdicts.append(f"{last}{self._first}:{last}{self._last}")
            sheet.verdicts.append(f"{mark}{self._first}:{mark}{self._last}")
        bad = "+".join(f'COUNTIF({area},"differs")' for area in areas) or "0"
        good = "+".join(f'COUNTIF({area},"agrees")' for area in areas) or "0"
        formula = f'IF({bad}>0,"differs",IF({good}>0,"agrees","error"))'
        sheet.put(self.top, 2, Formula(formula), "verdict")
        sheet.verdicts.append(local(self.top, 2))


def _formulas(step: RowStep) -> str:
    """The formulas of a step as people read them."""
    text = shown(step.formula)
    if step.first:
        text += f"; first row: {shown(step.first)}"
    if step.last and step.last != '""':
        text += f"; last row: {shown(step.last)}"
    return text


def unknown_names(working: TableLonghand, known: set[str]) -> set[str]:
    """Names that the formulas use and nothing gives; for the tests."""
    names = {s.symbol for s in (*working.rows, *working.single)} | known | set(working.defaults)
    used: set[str] = set()
    for step in (*working.rows, *working.single):
        texts = [step.formula]
        if isinstance(step, RowStep):
            texts += [step.first, step.last]
        for text in texts:
            for name in names_in(text):
                match = SUFFIX.fullmatch(name)
                used.add(match[1] if match else name)
    return used - names
