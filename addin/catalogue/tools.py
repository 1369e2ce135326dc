"""Rows of the tools."""

from __future__ import annotations

from .. import tools
from .types import Arg, NoLonghand, Result, Row

FAMILY = "Tools"
_ANY = (Result(name="value", role="text", text="answer"),)

ROWS = (
    Row(
        name="TB_CONVERT",
        family=FAMILY,
        summary="Converts a number, or every number of a range, from one unit to another.",
        kind="tool",
        has_units=False,
        args=(
            Arg(name="value", role="any", text="number or range of numbers"),
            Arg(name="from", role="text", text='unit of the number, such as "psi"'),
            Arg(name="to", role="text", text='unit wanted, such as "kPa"'),
            Arg(
                name="pamb",
                role="any",
                text="ambient absolute pressure in Pa, between gauge and absolute units",
                empty="standard atmosphere, 101 325 Pa",
                required=False,
            ),
        ),
        results=_ANY,
        routine=tools.convert,
        sign="The sign of the number is kept.",
        reference="NIST Special Publication 811 (2008), appendix B",
        example='TB_CONVERT(100, "psi", "kPa")',
        longhand=NoLonghand(reason="One multiplication; the factor is the ratio of the two units."),
    ),
    Row(
        name="TB_WHY",
        family=FAMILY,
        summary='Tells why a call fails, what to be careful of, or "ok".',
        kind="tool",
        has_units=False,
        args=(
            Arg(name="name", role="text", text='name of the function, such as "TB_BEND"'),
            Arg(
                name="argument",
                role="any",
                text="the arguments of that call, in the same order",
                empty="none",
                required=False,
                repeats=True,
            ),
        ),
        results=_ANY,
        routine=tools.why,
        sign="Not applicable.",
        reference="Own definition",
        example='TB_WHY("TB_AREA", "metric", -300)',
        longhand=NoLonghand(reason="The answer is text."),
    ),
    Row(
        name="TB_VERSION",
        family=FAMILY,
        summary="Tells the version of the product, of the catalogue, of the engine and of numpy.",
        kind="tool",
        has_units=False,
        args=(
            Arg(
                name="what",
                role="text",
                text='"product", "catalogue", "engine" or "numpy"',
                empty="all of them",
                required=False,
            ),
        ),
        results=_ANY,
        routine=tools.version,
        sign="Not applicable.",
        reference="Own definition",
        example='TB_VERSION("product")',
        longhand=NoLonghand(reason="The answer is text."),
    ),
    Row(
        name="TB_WORKING",
        family=FAMILY,
        summary="Shows the long-hand working of one call as a table: symbol, meaning, unit, equation, value. "
        "The steps are worked as worksheet formulas, not by the engine.",
        kind="tool",
        has_units=False,
        block=True,
        args=(
            Arg(name="name", role="text", text='name of the function, such as "TB_BEND"'),
            Arg(
                name="argument",
                role="any",
                text="the arguments of that call, in the same order",
                empty="none",
                required=False,
                repeats=True,
            ),
        ),
        results=_ANY,
        routine=tools.working,
        sign="As the function whose working is shown.",
        reference="The long-hand working of that function",
        example='TB_WORKING("TB_AREA", "metric", 300)',
        longhand=NoLonghand(reason="It shows the working of another function."),
    ),
)
