"""Defined names: which text a name stands for, and names written out in formulas."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from ...xlsx.externals import Externals
from ...xlsx.formulashift import MovableFormula
from ...xlsx.package import NameRef
from .formulas import OPENS, Kind, Part, Unreadable, calls, join, literal, take_apart
from .lets import arguments_from, called, opens_lambda, without_lets

_DEEPEST = 16  # names that refer to names; deeper than any workbook, so that a circle ends


def split_sheet(text: str) -> tuple[str | None, str]:
    """``('My sheet', 'A1')`` for ``'My sheet'!A1``; None when no sheet is named."""
    place, mark, rest = text.rpartition("!")
    if not mark:
        return None, text
    if place.startswith("'") and place.endswith("'"):
        place = place[1:-1].replace("''", "'")
    return place, rest


def _is_outside(part: Part) -> bool:
    return part.kind is Kind.REFERENCE and "[" in part.text


class Names:
    """The defined names of a workbook; a sheet's own name goes before the workbook's."""

    def __init__(self, names: Iterable[NameRef], externals: Externals | None = None) -> None:
        self._externals = externals
        self.outside = False
        """Whether a value was taken that the file keeps of another workbook."""
        self._names: dict[tuple[str, str], NameRef] = {}
        for name in names:
            self._names[(name.sheet or "").casefold(), name.name.casefold()] = name
        self._parts: dict[NameRef, list[Part]] = {}
        self._calling: dict[NameRef, bool] = {}
        self._formula: dict[NameRef, bool] = {}

    def find(self, operand: str, sheet: str) -> NameRef | None:
        """The name that an operand (``Q`` or ``Sheet1!Q``) means in a formula on that sheet."""
        place, name = split_sheet(operand)
        key = name.casefold()
        local = self._names.get(((place or sheet).casefold(), key))
        return local or self._names.get(("", key))

    def parts(self, name: NameRef) -> list[Part]:
        """The text of a name, taken apart. Raises :class:`Unreadable`."""
        parts = self._parts.get(name)
        if parts is None:
            parts = self._parts[name] = take_apart(name.text.removeprefix("="))
        return parts

    def calling(self, name: NameRef, depth: int = 0) -> bool:
        """Whether a TB_ function is called in the name, or in a name that it refers to."""
        known = self._calling.get(name)
        if known is not None:
            return known
        if depth > _DEEPEST:
            return False
        try:
            parts = self.parts(name)
        except Unreadable:
            return False
        found = bool(calls(parts))
        for part in parts:
            if found:
                break
            if part.kind in (Kind.REFERENCE, Kind.OPEN):
                inner = self.find(part.text.removesuffix("("), name.sheet or "")
                found = inner is not None and self.calling(inner, depth + 1)
        if depth == 0:
            self._calling[name] = found
        return found

    def formula(self, name: NameRef) -> bool:
        """Whether the name is more than a constant or the same cells everywhere.

        One that refers to tables or to other workbooks is left to whoever reads it.
        """
        known = self._formula.get(name)
        if known is None:
            text = name.text.removeprefix("=")
            moving = MovableFormula(text, 1, 1).at(2, 2, around=True) != text
            known = "[" not in text and (moving or self._of_parts(name))
            if "[" in text and self._externals is not None:
                known = self._externals.grid(text) is not None
            self._formula[name] = known
        return known

    def _of_parts(self, name: NameRef) -> bool:
        try:
            return any(part.kind in OPENS or part.kind is Kind.OPERATOR for part in self.parts(name))
        except Unreadable:
            return False

    def that_call(self) -> list[str]:
        """The names in which a TB_ function is called."""
        return [name.name for name in self._names.values() if self.calling(name)]

    def written_out(self, parts: list[Part], sheet: str, row: int, col: int, depth: int = 0) -> list[Part]:
        """The parts of a formula with every name that is a formula itself replaced by its text.

        The evaluator drops names that call a TB_ function, and does not compute those of arrays
        nor those that mean another cell at each place. The LETs of a formula that calls one are
        written out, too. Raises :class:`Unreadable` for names in a circle.
        """
        parts = self._kept_outside(without_lets(self._functions(parts, sheet)))
        if not self._names:
            return parts
        out: list[Part] = []
        changed = False
        for part in parts:
            name = self.find(part.text, sheet) if part.kind is Kind.REFERENCE else None
            if name is None or not (self.calling(name) or self.formula(name)):
                out.append(part)
                continue
            if depth > _DEEPEST:
                raise Unreadable(f"the name {name.name} refers to itself")
            changed = True
            inner = self._at(name, row, col)
            inner = self.written_out(inner, name.sheet or sheet, row, col, depth + 1)
            alone = len(inner) == 1
            out += inner if alone else [Part("(", Kind.PAREN_OPEN), *inner, Part(")", Kind.PAREN_CLOSE)]
        return without_lets(out) if changed else parts

    def _functions(self, parts: list[Part], sheet: str, depth: int = 0) -> list[Part]:
        """The parts with every call of a name that is a function, and calls a TB_ function, written out."""
        at = next((i for i, part in enumerate(parts) if self._function(part, sheet) is not None), None)
        if at is None:
            return parts
        if depth > _DEEPEST:
            raise Unreadable(f"the name {parts[at].text[:-1]} refers to itself")
        name = self._function(parts[at], sheet)
        assert name is not None
        arguments, end = arguments_from(parts, at + 1)
        written = called(self.parts(name), arguments)
        return self._functions([*parts[:at], *written, *parts[end:]], sheet, depth + 1)

    def _function(self, part: Part, sheet: str) -> NameRef | None:
        """The name that a call calls, where that is a LAMBDA with a TB_ function in it."""
        if part.kind is not Kind.OPEN or not self._names:
            return None
        name = self.find(part.text[:-1], sheet)
        if name is None or not self.calling(name):
            return None
        first = next((p for p in self.parts(name) if p.kind is not Kind.SPACE), None)
        return name if first is not None and opens_lambda(first) else None

    def _kept_outside(self, parts: list[Part]) -> list[Part]:
        """The parts with cells of other workbooks as the values that the file keeps of them."""
        if self._externals is None or not any(_is_outside(part) for part in parts):
            return parts
        out: list[Part] = []
        for part in parts:
            grid = self._externals.grid(part.text) if _is_outside(part) else None
            if grid is None:
                out.append(part)
                continue
            self.outside = True
            lines = [",".join('""' if value is None else literal(value) for value in line) for line in grid]
            text = ";".join(lines)
            out += take_apart(text if len(grid) == len(grid[0]) == 1 else f"{{{text}}}")
        return out

    def _at(self, name: NameRef, row: int, col: int) -> list[Part]:
        """The text of a name as it reads in one cell: its free references count from A1."""
        parts = self.parts(name)
        text = join(parts)
        moved = MovableFormula(text, 1, 1).at(row, col, around=True)
        return parts if moved == text else take_apart(moved)

    def direct_calls(self, parts: Sequence[Part], sheet: str) -> list[str]:
        """The TB_ functions called in a formula itself and in the names it uses, one level deep."""
        found = calls(parts)
        for part in parts:
            name = self.find(part.text, sheet) if part.kind is Kind.REFERENCE else None
            if name is not None and self.calling(name):
                found += calls(self.parts(name))
        return found
