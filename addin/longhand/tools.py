"""TB_CONVERT written out: one multiplication, and the shift of the datum."""

from __future__ import annotations

from ..units import UnitError, convert
from .arguments import Argument
from .calls import NotWorked, Refuses
from .outcomes import WordsOutcome, written
from .symbols import number, quoted


def convert_outcome(given: list[Argument]) -> WordsOutcome:
    """A conversion between two units that are constants, or cells as they stand. Raises NotWorked."""
    if len(given) < 3:
        raise NotWorked("TB_CONVERT without two units")
    source, target = given[1].value(), given[2].value()
    if not isinstance(source, str) or not isinstance(target, str):
        raise NotWorked("a unit of TB_CONVERT is not a text")
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

    def formula(i: int, j: int) -> str:
        text = f"{given[0].text(written, i, j)}*{number(factor)}"
        if shift:
            text += f"+{number(shift)}"
        if ambient:
            pamb = given[3].text(written) if len(given) > 3 and given[3].form != "empty" else "101325"
            text += f"+{pamb}*{number(ambient)}"
        return f"IF(AND({','.join(guards)}),{text},NA())" if guards else text

    rows, cols = given[0].shape
    return WordsOutcome([[None] * cols for _ in range(rows)], formula)
