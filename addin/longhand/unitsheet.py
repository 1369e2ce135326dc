"""The sheet of units: every factor of the workings once, tied to the cell that names the unit."""

from __future__ import annotations

from ..cells import Cell, Scalar
from ..leading import read_units
from ..units import ROLES, SETS, Unit, UnitError, UnitSet, known_units, unit
from .arguments import Argument
from .calls import NotWorked, Refuses
from .convert import Conversion
from .grid import Formula, Sheet, fixed
from .symbols import number, quoted, si_unit

_FIRST = 5
_LIST_COLUMN = 8


class UnitSheet:
    """Units of every unit set that the workbook uses, by set and role."""

    def __init__(self, sheet: Sheet) -> None:
        self.sheet = sheet
        self._at = _FIRST
        self._known: dict[tuple[str, str], Conversion] = {}
        self._sets: dict[str, UnitSet] = {}
        self._lists: dict[tuple[str, int, float], tuple[int, int]] = {}
        self._list_at = _FIRST
        sheet.put(1, 1, "Units and factors of the long-hand working", "title")
        sheet.put(
            2,
            1,
            "SI value = value x factor (+ the zero of a scale of temperature). "
            "A unit taken from a cell is looked up in the list on the right, "
            "so that the working follows when the cell names another unit.",
            "note",
        )
        heads = ["unit set", "quantity", "unit", "factor to SI", "SI unit"]
        sheet.line(4, list(heads), "head")
        sheet.line(4, ["unit", "factor", "quantity"], "head", _LIST_COLUMN)
        sheet.widths |= {
            1: 30.0,
            2: 14.0,
            3: 12.0,
            4: 18.0,
            5: 10.0,
            6: 4.0,
            7: 4.0,
            8: 14.0,
            9: 18.0,
            10: 14.0,
        }
        sheet.title_rows = (4, 4)

    @property
    def used(self) -> bool:
        """Whether any unit stands here."""
        return self._at > _FIRST

    def read(self, argument: Argument) -> tuple[str, UnitSet]:
        """The unit set of a call and the key under which its units stand here."""
        key, cell = self._key(argument)
        found = self._sets.get(key)
        if found is None:
            try:
                found = self._sets[key] = read_units(cell)
            except UnitError as error:
                raise Refuses(str(error)) from None
        return key, found

    def _key(self, argument: Argument) -> tuple[str, Cell]:
        if argument.form == "empty":
            return "SI", None
        if argument.values is None:
            raise NotWorked("the units are an expression")
        single = argument.shape == (1, 1)
        cell: Cell = argument.values[0][0] if single else argument.values
        if argument.area is not None:
            return argument.area.text(), cell
        return str(cell), cell

    def conversion(self, argument: Argument, role: str) -> Conversion:
        """The unit of a role in the set of a call."""
        if role in ("text", "choice", "any"):
            return Conversion("", 1.0)
        key, units = self.read(argument)
        known = self._known.get((key, role))
        if known is None:
            given = units.unit(role)
            if argument.area is None:
                known = Conversion.of(given)
            else:
                known = self._listed(argument, role, given)
            self._known[key, role] = known
        return known

    def _listed(self, argument: Argument, role: str, given: Unit) -> Conversion:
        """A row of the sheet for a unit that a cell names."""
        sheet, at = self.sheet, self._at
        self._at += 1
        sheet.put(at, 1, argument.shown())
        sheet.put(at, 2, role)
        content, name = self._name(argument, role, given)
        sheet.put(at, 3, content, "linkedtext")
        if name is None:
            sheet.put(at, 4, content_factor(argument, given), "number")
        else:
            first, last = self._list(role, given)
            names = f"{fixed(first, _LIST_COLUMN)}:{fixed(last, _LIST_COLUMN)}"
            factors = f"{fixed(first, _LIST_COLUMN + 1)}:{fixed(last, _LIST_COLUMN + 1)}"
            # MATCH does not mind capitals, so the spelling found is compared once more.
            here = f"TRIM({fixed(at, 3)})"
            found = f"MATCH({here},{names},0)"
            formula = f"IF(EXACT(INDEX({names},{found}),{here}),INDEX({factors},{found}),NA())"
            sheet.put(at, 4, Formula(formula), "number")
        sheet.put(at, 5, si_unit(role))
        return Conversion(Formula(sheet.ref(at, 3)), Formula(sheet.ref(at, 4)), given.shift, given.offset)

    def _name(self, argument: Argument, role: str, given: Unit) -> tuple[Formula | str, str | None]:
        """The content of the unit cell; with it the unit's name where a cell holds it."""
        area = argument.area
        assert area is not None
        assert argument.values is not None
        if argument.shape == (1, 1):
            return given.symbol, None
        for i, line in enumerate(argument.values):
            if _is_role(line[0], role):
                return Formula(area.ref(i, 1)), given.symbol
        return given.symbol, None

    def _list(self, role: str, given: Unit) -> tuple[int, int]:
        """The spellings of units of a role, with the datum of the unit given."""
        key = (ROLES[role].si, given.shift, given.offset)
        if key not in self._lists:
            first = self._list_at
            names = [n for n in known_units(role) if unit(n, role)[2:] == given[2:]]
            for name in dict.fromkeys((given.symbol, *names)):
                self.sheet.put(self._list_at, _LIST_COLUMN, name)
                self.sheet.put(self._list_at, _LIST_COLUMN + 1, unit(name, role).factor, "number")
                self.sheet.put(self._list_at, _LIST_COLUMN + 2, role)
                self._list_at += 1
            self._lists[key] = first, self._list_at - 1
            self._list_at += 1
        return self._lists[key]


def content_factor(argument: Argument, given: Unit) -> Formula | float:
    """The factor of a unit that comes with the name of a whole set, kept only while that name stands."""
    area = argument.area
    assert area is not None
    assert argument.values is not None
    for i, line in enumerate(argument.values):
        word = line[-1]
        if isinstance(word, str) and word.strip().lower() in SETS:
            ref = area.ref(i, len(line) - 1)
            return Formula(
                f"IF(LOWER(TRIM({ref}))={quoted(word.strip().lower())},{number(given.factor)},NA())"
            )
    return given.factor


def _is_role(cell: Scalar, role: str) -> bool:
    return isinstance(cell, str) and cell.strip().lower() == role
