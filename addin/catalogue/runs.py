"""Rows of the pipe run."""

from __future__ import annotations

from typing import Final

from ..blocks.run import RESULTS, run
from ..blocks.runcases import RESULTS as CASE_RESULTS
from ..blocks.runcases import runcases
from ..blocks.runread import CASE_COLUMNS, NODE_COLUMNS, START_COLUMNS
from .types import Arg, Row
from .workings import runs as workings_runs

FAMILY = "Blocks"

_START: Final = Arg(
    name="start",
    role="table",
    text="what is known at one end: name | value, or name | value | unit",
    columns=START_COLUMNS,
)
_HEADINGS: Final = Arg(
    name="headings",
    role="headings",
    text='names of the columns of the table, a unit in brackets where it differs: "D [in]"',
)
_TABLE: Final = Arg(
    name="table",
    role="table",
    text="the nodes in order along the run, one a row; the columns D, e, Dj, f, alpha, beta are of the leg "
    "that leaves the node",
    columns=NODE_COLUMNS,
)
_CASES: Final = Arg(
    name="cases",
    role="table",
    text="the load cases, one a row under a row of headings",
    columns=CASE_COLUMNS,
)
_SIGN: Final = (
    "x east, y north, z up. F is the thrust of the fluid on the node, ambient pressure outside; the reaction "
    "of the restraint is its opposite. Flow is positive in the order of the nodes. Section 1 is the side of "
    "the leg that arrives, section 2 of the leg that leaves. The bearing turns clockwise from north."
)
_REFERENCE: Final = (
    "Momentum balance of each node, Bernoulli's equation with Darcy-Weisbach friction and local losses along "
    "the run; derived"
)
_START_EXAMPLE: Final = '{"rho",1000;"mu",1;"Q",100;"p",500}'
_HEADINGS_EXAMPLE: Final = '{"name","x","y","z","D","e"}'
_TABLE_EXAMPLE: Final = '{"A",0,0,10,300,0.1;"B",50,0,10,300,0.1;"C",50,60,12,300,0.1}'
_CASES_EXAMPLE: Final = '{"case","kind","p";"normal","operating",500;"test","test",900}'

ROWS = (
    Row(
        name="TB_RUN",
        family=FAMILY,
        summary="A pipe run node by node from coordinates: flow, pressures, grade lines, thrust and remarks.",
        kind="table",
        args=(_START, _HEADINGS, _TABLE),
        results=RESULTS,
        routine=run,
        sign=_SIGN,
        reference=_REFERENCE,
        example=f'TB_RUN("F","metric",{_START_EXAMPLE},{_HEADINGS_EXAMPLE},{_TABLE_EXAMPLE})',
        block=True,
        longhand=workings_runs.TB_RUN,
    ),
    Row(
        name="TB_RUNCASES",
        family=FAMILY,
        summary="A pipe run under load cases: what governs at each node, by magnitude and by component.",
        kind="table",
        args=(_START, _HEADINGS, _TABLE, _CASES),
        results=CASE_RESULTS,
        routine=runcases,
        sign=f"{_SIGN} A governing component keeps its sign.",
        reference=_REFERENCE,
        example=f'TB_RUNCASES("F","metric",{_START_EXAMPLE},{_HEADINGS_EXAMPLE},{_TABLE_EXAMPLE},'
        f"{_CASES_EXAMPLE})",
        block=True,
        longhand=workings_runs.TB_RUN,
    ),
)
