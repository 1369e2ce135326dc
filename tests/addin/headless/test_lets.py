"""LET and LAMBDA written out."""

from __future__ import annotations

import pytest

from thrustbook.addin.hosts.headless.formulas import Unreadable, join, take_apart
from thrustbook.addin.hosts.headless.lets import without_lets
from thrustbook.addin.hosts.headless.names import Names
from thrustbook.addin.xlsx.package import NameRef


@pytest.mark.parametrize(
    ("text", "written"),
    [
        ("LET(x,A1,TB_A(x))", "(TB_A(A1))"),
        ("LET(x,A1+1,y,x*2,TB_A(x,y))", "(TB_A((A1+1),((A1+1)*2)))"),
        ("_xlfn.LET(_xlpm.x,A1,TB_A(_xlpm.X)+x)", "(TB_A(A1)+A1)"),
        ("LET(x,1,LET(x,x+1,TB_A(x)))+x", "((TB_A((1+1))))+x"),
        ("LET(x,A1,B1)", "LET(x,A1,B1)"),  # none of our business
        ("LAMBDA(a,b,TB_A(a,b))(1,B2:B4)", "(TB_A(1,B2:B4))"),
        ("LET(x,2,LAMBDA(x,TB_A(x))(x+1))", "((TB_A((2+1))))"),
        ("MAP(A1:A3,LAMBDA(x,TB_A(x)))", "MAP(A1:A3,LAMBDA(x,TB_A(x)))"),
    ],
)
def test_written_out(text: str, written: str) -> None:
    assert join(without_lets(take_apart(text))) == written


@pytest.mark.parametrize(
    "text",
    [
        "LET(x,A1)+TB_A(1)",
        "LET(1,A1,TB_A(1))",
        "LAMBDA(x,TB_A(x))(1,2)",
        "LAMBDA(x,TB_A(x))()",
        "LET(a,A1+A1,b,a+a,c,b+b,d,c+c,e,d+d,f,e+e,g,f+f,h,g+g,i,h+h,j,i+i,k,j+j,l,k+k,TB_A(l))",
    ],
)
def test_refused(text: str) -> None:
    with pytest.raises(Unreadable):
        without_lets(take_apart(text))


def names() -> Names:
    texts = {
        "AREA2": "LAMBDA(d,TB_AREA(d)*2)",
        "MORE": "LAMBDA(d,k,AREA2(d)+k)",
        "NATIVE": "LAMBDA(d,d*2)",
        "LOOP": "LAMBDA(d,TB_AREA(LOOP(d)))",
    }
    return Names([NameRef(name, text, None) for name, text in texts.items()])


@pytest.mark.parametrize(
    ("text", "written"),
    [
        ("AREA2(A1)+1", "(TB_AREA(A1)*2)+1"),
        ("MORE(A1,AREA2(3))", "((TB_AREA(A1)*2)+((TB_AREA(3)*2)))"),
        ("NATIVE(A1)+SUM(B1:B3)", "NATIVE(A1)+SUM(B1:B3)"),
    ],
)
def test_functions_that_are_names(text: str, written: str) -> None:
    assert join(names().written_out(take_apart(text), "S", 1, 1)) == written


def test_a_function_that_calls_itself_is_refused() -> None:
    with pytest.raises(Unreadable):
        names().written_out(take_apart("LOOP(1)"), "S", 1, 1)
