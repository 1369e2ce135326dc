"""TB_CONVERT written out: one multiplication, and the shift of the datum."""

from __future__ import annotations

from ..units import UnitError, convert
from .arguments import Argument
from .calls import Refuses
from .expressions import SINGLE
from .outcomes import WordsOutcome, written
from .symbols import number, quoted


def convert_outcome(given: list[Argument]) -> WordsOutcome:
    """A conversion between two units that are constants, or cells as they stand. Raises NotWorked."""
    source, target = _word(given, 1, "from"), _word(given, 2, "to")
    try:
        # The conversion is linear, so two of its values give it whole.
        shift = convert(0.0, source, target, 0.0)
        factor = convert(1.0, source, target, 0.0) - shift
        ambient = convert(0.0, source, target, 1.0) - shift
    except UnitError as error:
        raise Refuses(str(error)) from None
    guards = [
        f"EXACT({argument.text(written)},{quoted(word)})"
        for argument, word in ((given[1], source), (given[2], target))
        if argument.area is not None
    ]
    pressure = given[3] if len(given) > 3 and given[3].form != "empty" else None
    if pressure is not None and pressure.shape != SINGLE:
        raise Refuses("pamb is a range")

    def formula(i: int, j: int) -> str:
        value = given[0].text(written, i, j)
        tests = [] if _is_number(given[0]) else [f"ISNUMBER({value})"]
        text = f"{value if len(given[0].items) < 2 else f'({value})'}*{number(factor)}"
        if shift:
            text += f"+{number(shift)}"
        pamb = "101325"
        if pressure is not None:
            pamb = pressure.text(written)
            blank = pressure.area is not None
            if not _is_number(pressure):
                tests.append(f"OR(ISBLANK({pamb}),ISNUMBER({pamb}))" if blank else f"ISNUMBER({pamb})")
            pamb = f"IF(ISBLANK({pamb}),101325,{pamb})" if blank else f"({pamb})"
        if ambient:
            text += f"+{pamb}*{number(ambient)}"
        # As in the function itself a text or an empty cell is no number.
        text = f"IF(AND({','.join(tests)}),{text},#VALUE!)" if tests else f"({text})"
        return f"IF(AND({','.join(guards)}),{text},NA())" if guards else text

    rows, cols = given[0].shape
    return WordsOutcome([[None] * cols for _ in range(rows)], formula)


def _word(given: list[Argument], k: int, name: str) -> str:
    """A unit as it is stored now. Raises Refuses as the function does."""
    word = given[k].value() if k < len(given) and given[k].shape == SINGLE else None
    if not isinstance(word, str):
        raise Refuses(f"{name} is no text")
    return word


def _is_number(argument: Argument) -> bool:
    return argument.form == "literal" and isinstance(argument.value(), float)
