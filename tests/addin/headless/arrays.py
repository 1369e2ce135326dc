"""Functions with single values as arguments: a sheet of data, a sample call of each, and formulas.

A letter in braces stands for a value of that column: its cell in one row, or its three cells
as a range. The columns V to Z hold what a function takes as a range.
"""

from __future__ import annotations

import re
from typing import Any, Final

from openpyxl.utils import FORMULAE

ROWS: Final = 3


def _texts(text: str, separator: str | None = None) -> tuple[str, ...]:
    return tuple(piece.strip() for piece in text.split(separator))


COLUMNS: Final[dict[str, tuple[Any, Any, Any]]] = {
    "A": (0.3, 0.5, 0.7),
    "B": (2, 3, 5),
    "C": (7, 11, 13),
    "D": (45000.25, 45100.5, 45250.75),  # days with a time
    "E": (45300, 45400, 45555),
    "F": ("abc", "De  f", "ghiCj"),
    "G": ("b", "e", "C"),  # each within the text beside it
    "H": (True, False, True),
    "I": ("3+4i", "1-2i", "2+i"),
    "J": (-1.5, 2.5, -3.25),
    "K": (1, 2, 1),
    "L": ("101", "110", "11"),
    "M": (5, "text", None),
    "N": (1, "=NA()", "=1/0"),
    "O": ("12.5", "3", "400"),
    "P": ("2024-01-05", "2023-12-31", "2024-02-29"),
    "Q": ("10:20", "06:00", "23:59:30"),
    "R": (65, 66, 99),
    "S": (1, 4, 6),
    "T": ("IX", "XL", "MMXX"),
    "U": (0, 1, -1),
}
WHOLE: Final[dict[str, tuple[Any, ...]]] = {
    "V": (45000, 45100, 45200, 45300, 45400, 45500),
    "W": (-100, 20, 30, 40, 50, 10),
    "X": (1, 2, 4, 6, 8, 9),
    "Y": (10, 25, 30, 45, 70, 75),
    "Z": ("a", "b", "a", "c", "b", "a"),
}

SAMPLES: Final = _texts(
    """
ABS({J}) ACOS({A}) ACOSH({B}) ACOT({A}) ACOTH({B}) ASIN({A}) ASINH({A}) ATAN({A}) ATANH({A}) ATAN2({A},{J})
COS({A}) COSH({A}) COT({A}) COTH({A}) CSC({A}) CSCH({A}) SEC({A}) SECH({A}) SIN({A}) SINH({A}) TAN({A})
TANH({A}) DEGREES({A}) RADIANS({J}) EXP({A}) LN({A}) LOG({C},{B}) LOG10({A}) SQRT({A}) SQRTPI({A})
POWER({A},{B}) SIGN({J}) INT({J}) TRUNC({J},{K}) ROUND({J},{U}) ROUNDUP({J},{U}) ROUNDDOWN({J},{U})
EVEN({J}) ODD({J}) CEILING({C},{B}) FLOOR({C},{B}) CEILING.MATH({J},{B}) FLOOR.MATH({J},{B})
CEILING.PRECISE({J},{B}) FLOOR.PRECISE({J},{B}) ISO.CEILING({J},{B}) MROUND({C},{B}) MOD({C},{B})
QUOTIENT({C},{B}) FACT({B}) FACTDOUBLE({C}) COMBIN({C},{B}) COMBINA({C},{B}) PERMUT({C},{B}) BASE({C},{B})
DECIMAL({L},{B}) ROMAN({C}) ARABIC({T}) GAMMA({A}) GAMMALN({A}) GAMMALN.PRECISE({A}) ERF({A}) ERF({A},{B})
ERFC({A}) ERF.PRECISE({A}) ERFC.PRECISE({A}) GAUSS({A}) PHI({A}) FISHER({A}) FISHERINV({A}) DELTA({B},{K})
GESTEP({B},{C}) BITAND({B},{C}) BITOR({B},{C}) BITXOR({B},{C}) BITLSHIFT({B},{K}) BITRSHIFT({C},{K})
BESSELI({A},{B}) BESSELJ({A},{B}) BESSELK({A},{B}) BESSELY({A},{B}) BIN2DEC({L}) BIN2HEX({L}) BIN2OCT({L})
DEC2BIN({C}) DEC2HEX({C}) DEC2OCT({C}) HEX2BIN({L}) HEX2DEC({L}) HEX2OCT({L}) OCT2BIN({L}) OCT2DEC({L})
OCT2HEX({L}) CONVERT({B},"m","ft") COMPLEX({B},{C}) IMABS({I}) IMAGINARY({I}) IMREAL({I}) IMARGUMENT({I})
IMCONJUGATE({I}) IMCOS({I}) IMCOSH({I}) IMCOT({I}) IMCSC({I}) IMDIV({I},"1+i") IMEXP({I}) IMLN({I})
IMLOG10({I}) IMLOG2({I}) IMPOWER({I},{B}) IMSEC({I}) IMSIN({I}) IMSINH({I}) IMSQRT({I}) IMSUB({I},"1+i")
IMTAN({I}) LEN({F}) LENB({F}) LEFT({F},{B}) LEFT({F}) RIGHT({F},{B}) MID({F},{K},{B}) LEFTB({F},{B})
RIGHTB({F},{B}) MIDB({F},{K},{B}) UPPER({F}) LOWER({F}) PROPER({F}) TRIM({F}) CLEAN({F}) CODE({F})
UNICODE({F}) CHAR({R}) UNICHAR({R}) FIND({G},{F}) FIND({G},{F},{K}) SEARCH({G},{F}) FINDB({G},{F})
SEARCHB({G},{F}) REPLACE({F},{K},{B},{G}) REPLACEB({F},{K},{B},{G}) SUBSTITUTE({F},{G},{O}) REPT({F},{B})
EXACT({F},"abc") CONCATENATE({F},{G}) TEXT({J},"0.00") FIXED({C},{K}) DOLLAR({C},{K}) VALUE({O})
NUMBERVALUE({O},".",",") DATEVALUE({P}) TIMEVALUE({Q}) ASC({F}) HYPERLINK({F},{G}) TEXTAFTER({F},{G})
TEXTBEFORE({F},{G}) VALUETOTEXT({F}) DATE({C},{B},{K}) TIME({B},{C},{K}) YEAR({D}) MONTH({D}) DAY({D})
HOUR({D}) MINUTE({D}) SECOND({D}) WEEKDAY({D},{K}) WEEKNUM({D},{K}) ISOWEEKNUM({D}) DAYS({E},{D})
DAYS360({D},{E}) EDATE({D},{B}) EOMONTH({D},{B}) YEARFRAC({D},{E},{K}) DATEDIF({D},{E},"m")
NETWORKDAYS({D},{E}) WORKDAY({D},{B}) NETWORKDAYS.INTL({D},{E},{K}) WORKDAY.INTL({D},{B},{K}) ISBLANK({M})
ISERR({N}) ISERROR({N}) ISNA({N}) ISLOGICAL({H}) ISNONTEXT({M}) ISNUMBER({M}) ISTEXT({M}) ISEVEN({B})
ISODD({B}) ERROR.TYPE({N}) NOT({H}) IF({H},{B},{C}) IF({B}>2,{C}) IFERROR({N},{B}) IFNA({N},{B})
IFS({B}>2,{C},TRUE,{J}) SWITCH({B},2,{C},3,{J},{A}) CHOOSE({K},{B},{C}) PMT({A},{B},{C}) FV({A},{B},{C})
PV({A},{B},{C}) NPER({A},{B},{J}) IPMT({A},{K},{B},{C}) PPMT({A},{K},{B},{C}) ISPMT({A},{K},{B},{C})
RATE({C},{J},{B}) CUMIPMT({A},{C},{R},{K},{B},0) CUMPRINC({A},{C},{R},{K},{B},0) SLN({R},{C},{B})
SYD({R},{C},{B},{K}) DB({R},{C},{B},{K}) DDB({R},{C},{B},{K}) EFFECT({A},{B}) NOMINAL({A},{B})
PDURATION({A},{B},{C}) RRI({B},{C},{R}) DOLLARDE({J},{B}) DOLLARFR({J},{B}) TBILLEQ({D},45360,{A})
TBILLPRICE({E},45600,{A}) TBILLYIELD({E},45600,{R}) STANDARDIZE({A},{B},{C}) NORM.DIST({A},{B},{C},TRUE)
NORM.INV({A},{B},{C}) NORM.S.DIST({A},TRUE) NORM.S.INV({A}) NORMDIST({A},{B},{C},TRUE) NORMINV({A},{B},{C})
NORMSDIST({A}) NORMSINV({A}) T.DIST({A},{B},TRUE) T.DIST.2T({A},{B}) T.DIST.RT({A},{B}) T.INV({A},{B})
T.INV.2T({A},{B}) TDIST({A},{B},{K}) TINV({A},{B}) CHISQ.DIST({A},{B},TRUE) CHISQ.DIST.RT({A},{B})
CHISQ.INV({A},{B}) CHISQ.INV.RT({A},{B}) CHIDIST({A},{B}) CHIINV({A},{B}) F.DIST({A},{B},{C},TRUE)
F.DIST.RT({A},{B},{C}) F.INV({A},{B},{C}) F.INV.RT({A},{B},{C}) FDIST({A},{B},{C}) FINV({A},{B},{C})
BINOM.DIST({B},{C},{A},TRUE) BINOM.INV({C},{A},{A}) BINOM.DIST.RANGE({C},{A},{B})
BINOMDIST({B},{C},{A},TRUE) CRITBINOM({C},{A},{A}) NEGBINOM.DIST({B},{C},{A},TRUE) NEGBINOMDIST({B},{C},{A})
POISSON.DIST({B},{C},TRUE) POISSON({B},{C},TRUE) EXPON.DIST({A},{B},TRUE) EXPONDIST({A},{B},TRUE)
GAMMA.DIST({A},{B},{C},TRUE) GAMMA.INV({A},{B},{C}) GAMMADIST({A},{B},{C},TRUE) GAMMAINV({A},{B},{C})
BETA.DIST({A},{B},{C},TRUE) BETA.INV({A},{B},{C}) BETADIST({A},{B},{C}) BETAINV({A},{B},{C})
WEIBULL({A},{B},{C},TRUE) WEIBULL.DIST({A},{B},{C},TRUE) LOGNORM.DIST({A},{B},{C},TRUE)
LOGNORM.INV({A},{B},{C}) LOGNORMDIST({A},{B},{C}) LOGINV({A},{B},{C}) HYPGEOM.DIST({K},{B},{C},{R},TRUE)
HYPGEOMDIST({K},{B},{C},{R}) CONFIDENCE({A},{B},{C}) CONFIDENCE.NORM({A},{B},{C}) CONFIDENCE.T({A},{B},{C})
ADDRESS({B},{K}) VLOOKUP({S},$X$1:$Y$6,{K},FALSE) VLOOKUP({S},$X$1:$Y$6,2) HLOOKUP(1,$X$1:$Y$6,{B},FALSE)
MATCH({S},$X$1:$X$6,0) MATCH({R},$Y$1:$Y$6,1) LOOKUP({S},$X$1:$X$6,$Y$1:$Y$6)
XLOOKUP({S},$X$1:$X$6,$Y$1:$Y$6) XMATCH({S},$X$1:$X$6) INDEX($X$1:$Y$6,{B},{K}) INDEX($Y$1:$Y$6,{B})
COUNTIF($Z$1:$Z$6,{G}) COUNTIF($X$1:$X$6,{S}) COUNTIFS($Z$1:$Z$6,{G},$X$1:$X$6,">1")
SUMIF($Z$1:$Z$6,{G},$X$1:$X$6) SUMIF($X$1:$X$6,{S}) SUMIFS($X$1:$X$6,$Z$1:$Z$6,{G}) AVERAGEIF($X$1:$X$6,{S})
AVERAGEIFS($Y$1:$Y$6,$X$1:$X$6,{S}) MAXIFS($Y$1:$Y$6,$X$1:$X$6,{S}) MINIFS($Y$1:$Y$6,$X$1:$X$6,{S})
LARGE($Y$1:$Y$6,{B}) SMALL($Y$1:$Y$6,{B}) PERCENTILE($Y$1:$Y$6,{A}) PERCENTILE.INC($Y$1:$Y$6,{A})
PERCENTILE.EXC($Y$1:$Y$6,{A}) QUARTILE($Y$1:$Y$6,{K}) QUARTILE.INC($Y$1:$Y$6,{K})
QUARTILE.EXC($Y$1:$Y$6,{K}) RANK({S},$X$1:$X$6,{K}) RANK.EQ({S},$X$1:$X$6) RANK.AVG({S},$X$1:$X$6)
PERCENTRANK($X$1:$X$6,{S}) PERCENTRANK.INC($X$1:$X$6,{S}) PERCENTRANK.EXC($X$1:$X$6,{S})
FORECAST({B},$X$1:$X$6,$Y$1:$Y$6) FORECAST.LINEAR({B},$X$1:$X$6,$Y$1:$Y$6) TRIMMEAN($Y$1:$Y$6,{A})
NPV({A},$X$1:$X$6) MIRR($W$1:$W$6,{A},{A}) XNPV({A},$W$1:$W$6,$V$1:$V$6) Z.TEST($X$1:$X$6,{B})
ZTEST($X$1:$X$6,{B}) SERIESSUM({A},{B},{K},$X$1:$X$6) SUBTOTAL({S},$X$1:$X$6) AGGREGATE({S},6,$X$1:$X$6)
TEXTJOIN({G},TRUE,$Z$1:$Z$6) ROW({A}) COLUMN({A}) INDIRECT("X"&{B}) OFFSET($X$1,{B},0) N({A}) T({F})
TYPE({A}) SHEET({A}) CELL("row",{A}) ISREF({A}) ISFORMULA({N}) FORMULATEXT({N})
ACCRINT({D},{E},{E},{A},1000,2) ACCRINTM({D},{E},{A},1000) PRICE({D},{E},{A},{A},100,2)
YIELD({D},{E},{A},95,100,2) RANDBETWEEN({B},{B})
"""
)
# What people write with ranges and arrays, and what they hardly write.
FORMULAS: Final = _texts(
    """
SUM(COUNTIF($Z$1:$Z$6,{"a","b"})) | SUM(LEN({"a","bb"})) | SUM(ABS({-1,-2})) | SUM(ABS(ROW(A1:A3))) |
ABS(ROW(A1:A3)) | LEN(ROW(A1:A3)) | SUM(ROW(A1:A3)*2) | ROW(A1:A3) | ROW(A1:A3)*2 |
SUM(ABS(INDEX($J$1:$J$3,0))) | SUM(ABS(OFFSET($J$1,0,0,3))) | SUM(ABS(INDIRECT("J1:J3"))) |
ABS(INDEX($J$1:$J$3,0)) | ABS(OFFSET($J$1,0,0,3)) | SUM(OFFSET($J$1,0,0,3)*2) |
SUM(INDEX($J$1:$J$3,0)*2) | SUM(IF(TRUE,J1:J3)*2) | SUM(ABS(IF(TRUE,J1:J3))) | SUM(IF(J1:J3>0,J1:J3)) |
SUM(J1:J3*2) | SUM(-J1:J3) | SUM((J1:J3)*2) | MAX(J1:J3+1) | SUM(LEN(F1:F3&"x")) | SUM(LEN(F1:F3)) |
LEN(F1:F3)&"x" | SUM(ABS(TRANSPOSE(J1:J3))) | SUM(ABS(MMULT(J1:J3,{1}))) | SUM(ABS((J1:J3))) |
SUM(SUMIF(Z1:Z6,G1:G3,X1:X6)) | SUM(SUMIF(Z1:Z6,{"a";"b"},X1:X6)) | SUM(VLOOKUP({1,4},X1:Y6,2,FALSE)) |
SUM(VLOOKUP(4,X1:Y6,{1,2},FALSE)) | INDEX(J1:J3*2,3) | MATCH(3,X1:X6*1,1) |
MATCH(1,(X1:X6=4)*(Z1:Z6="a"),0) | LOOKUP(2,1/(X1:X6=4),Y1:Y6) | SUMPRODUCT(IF(J1:J3>0,1,2)) |
SUMPRODUCT(ABS(J1:J3)) | SUMPRODUCT(--(LEFT(F1:F3,1)="a")) | SUMPRODUCT(LARGE(Y1:Y6,ROW(A1:A3))) |
SUM(LARGE(Y1:Y6,{1,2})) | SUM(LARGE(Y1:Y6,B1:B3)) | SUM(SMALL(Y1:Y6,ROW(INDIRECT("1:3")))) |
SUM(INDEX(Y1:Y6,{1,2})) | SUM(INDEX(Y1:Y6,N(IF(1,{1,2})))) | AND(J1:J3>0) | OR(J1:J3>2) |
AND(ISNUMBER(J1:J3)) | SUMPRODUCT(N(J1:J3>0)) | SUM(N(J1:J3>0)) | COUNT(FIND("e",F1:F3)) |
COUNT(MATCH(S1:S3,X1:X6,0)) | SUMPRODUCT(COUNTIF(Z1:Z6,G1:G3)) | SUMPRODUCT(1/COUNTIF(Z1:Z6,Z1:Z6)) |
CONCATENATE(F1:F3,"x") | TEXTJOIN("-",TRUE,LEFT(F1:F3,1)) | CONCAT(UPPER(F1:F3)) |
SUM(IFERROR(N1:N3,0)) | SUM(IF(ISERROR(N1:N3),0,N1:N3)) | SUM(MID("12345",{1,2,3},1)*1) |
SUM(--MID("12345",ROW(1:5),1)) | SUMPRODUCT(--MID("12345",ROW(1:5),1)) |
SUMPRODUCT(--MID("12345",ROW(INDIRECT("1:"&LEN("12345"))),1)) | SUMPRODUCT((MONTH(D1:D3)=5)*J1:J3) |
SUMPRODUCT(MOD(ROW(A1:A3),2)*J1:J3) | SUMPRODUCT(ROUND(J1:J3,0)) |
SUMPRODUCT(SUBTOTAL(9,OFFSET(X1,ROW(X1:X6)-ROW(X1),0))) | SUMPRODUCT(MAX((Z1:Z6="a")*ROW(Z1:Z6))) |
SUMPRODUCT((A1:A3)*(A1:C1)) | SUMPRODUCT(MOD(B1:B3,A1:C1+1)) | SUMPRODUCT(ROUND(B1:B3*A1:C1,0)) |
SUM(ROUND(B1:B3*A1:C1,0)) | COLUMN(A1:C1) | SUM(COLUMN(A1:C1)) | SUMPRODUCT(ROW(A1:A3)*COLUMN(A1:C1)) |
ROW() | SUM(ROW()) | SUMPRODUCT(ROW(A1:B3)) | SUMPRODUCT(COLUMN(A1:B3)) |
SUMPRODUCT(ROW(A:A)*(A:A=0.7)) | SUMPRODUCT(LEN(A:A)) | SUMPRODUCT(LEN(M1:M3)) |
SUMPRODUCT(ABS(M2:M3)) | SUM(SUMIFS(X1:X6,Z1:Z6,{"a","b"})) | SUMPRODUCT(SUMIFS(X1:X6,Z1:Z6,G1:G3)) |
SUM(CHOOSE({1,2},A1:A3,B1:B3)) | VLOOKUP(2,CHOOSE({1,2},B1:B3,C1:C3),2,FALSE) | SUM(IF({1,0},J1,5)) |
MAX(IF(Z1:Z6="a",X1:X6)) | SUM(POWER(10,{1,2})) | SUM(B1:B3^{1,2}) | SUM(10^{1,2}) |
SUMPRODUCT(EXACT(F1:F3,"abc")*1) | SUMPRODUCT(SQRT(B1:B3),C1:C3) | MMULT(ABS(J1:J3),{1}) |
SUM(MMULT(ABS(J1:J3),{1})) | SUM(TRANSPOSE(ABS(J1:J3))) | FREQUENCY(ABS(J1:J3),2) |
SUM(FREQUENCY(ABS(J1:J3),2)) | FORECAST(3,ABS(J1:J3),B1:B3) | CORREL(ABS(J1:J3),B1:B3) |
INDEX(LINEST(LN(B1:B3),C1:C3),1) | SUMXMY2(ABS(J1:J3),B1:B3) | MEDIAN(ABS(J1:J3)) | STDEV(J1:J3*1) |
NPV(0.1,ABS(J1:J3)) | IRR(W1:W6*1) | COUNTIF(ABS(J1:J3),1.5) | LARGE(ABS(J1:J3),1) |
AGGREGATE(14,6,ABS(J1:J3),1) | MODE(ABS(J1:J3)) | SUMSQ(ABS(J1:J3)) | MDETERM(ABS({1,2;3,4})) |
LOOKUP(2,ABS(J1:J3)) | HLOOKUP(2,TRANSPOSE(B1:B3),1) | MATCH("E",UPPER(G1:G3),0) | RANK(2,B1:B3) |
PERCENTILE(ABS(J1:J3),0.5) | AVERAGE(ABS(J1:J3)) | T(F1:F3) | N(J1:J3) | TYPE(J1:J3) |
SUM(N(OFFSET(J1,{0,1,2},0))) | SUMPRODUCT(N(OFFSET(J1,{0,1,2},0))) | ISREF(A1:A3) |
SUMPRODUCT(--ISBLANK(M1:M3)) | SUMPRODUCT(--ISERROR(N1:N3)) | SUM(--ISERROR(N1:N3)) | XOR(H1:H3) |
GCD(B1:B3*2) | SUM(YEAR(D1:D3)) | SUMPRODUCT(YEAR(D1:D3)) | MAX(LEN(F1:F3)) |
INDEX(F1:F3,MATCH(MAX(LEN(F1:F3)),LEN(F1:F3),0)) | SUM(ROW(A1:A3),1) | SUM(SIN(B1:B3)) |
SUMPRODUCT(SIN(B1:B3)) | IF(SUM(ABS(J1:J3))>1,1,2) | SUMPRODUCT(SUM(ABS(J1:J3))) |
SUMPRODUCT(SUM(J1:J3*2)) | ISNUMBER(MATCH(4,X1:X6*1,0)) | SUM(ABS(ROW(A1:A3)*2)) |
SUM(ABS(-ROW(A1:A3))) | SUM(LEN(IF(TRUE,ROW(A1:A3)))) | SUM(LARGE(Y1:Y6,ROW(A1:A3))) |
INDEX(X1:X6,ROW(A1:A3)) | SUM(INDEX(X1:X6,ROW(A1:A3))) | SUM(MOD(ROW(A1:A3),2)*J1:J3) |
SUM((ROW(A1:A3)>1)*1) | MAX((Z1:Z6="a")*ROW(Z1:Z6)) | IF(ROW(A1:A3)>1,5,6) |
SUM(IF(ROW(A1:A3)>1,5,6)) | SUM(ABS(LARGE(Y1:Y6,{1,2}))) | SUM(ABS(INDEX(J1:J3,{1;2}))) |
SUM(SUMIF(Z1:Z6,IF(TRUE,{"a","b"}),X1:X6)) | SUM(ABS(COLUMN(A1:C1))) | SUM(ABS(CHOOSE({1,2},A1,B1))) |
SUM(ABS(IF({1,0},J1,J3))) | SUM(ABS(FREQUENCY(J1:J3,{0;1}))) | SUM(CHOOSE(2,A1:A3,B1:B3)) |
SUM(CHOOSE(2,A1:A3,B1:B3)*2) | SUM(IFERROR(J1:J3,0)) | SUM(IFERROR(J1:J3*2,0)) | SUM(IFNA(J1:J3,0)) |
SUMPRODUCT(COUNTIFS(Z1:Z6,G1:G3,X1:X6,">1")) | SUM(NOT(H1:H3)*1) | SUM(ABS(J1:J3),B1:B3) |
SUM(B1:B3)*ABS(J1:J3) | ABS(SUM(B1:B3)) | ABS(J1:J3)*{1,2} | SUM(ABS(J1:J3)*{1,2}) |
SUMPRODUCT(--ISNUMBER(SEARCH({"a","e"},F1:F3))) | SUMPRODUCT(--(WEEKDAY(D1:D3,2)>5)) |
SUMPRODUCT(IFERROR(N1:N3,0)) | SUMPRODUCT(N(A1:A3)) | TEXTJOIN("",TRUE,MID("abc",{3,2,1},1)) |
SUMPRODUCT(VALUE(O1:O3)) | SUMPRODUCT(ROUND(J1:J3,U1:U3)) | SUMPRODUCT(TRUNC(J1:J3)) |
SUMPRODUCT(LOOKUP(B1:B3,X1:X6,Y1:Y6)) | SUMPRODUCT(INDEX(Y1:Y6,B1:B3)) |
SUMPRODUCT(MATCH(S1:S3,X1:X6,0)) | SUMPRODUCT(RANK(S1:S3,X1:X6)) |
SUMPRODUCT(VLOOKUP(S1:S3,X1:Y6,2,FALSE)) | SUMPRODUCT(MOD(B1:B5,2)) |
SUMPRODUCT(LEN(SUBSTITUTE(F1:F3,"e",""))) | SUMPRODUCT(LEN(F1:F3)-LEN(SUBSTITUTE(F1:F3,"e",""))) |
SUMPRODUCT(DATE(2020,B1:B3,1)) | SUMPRODUCT(MOD(B1:B3,B1:B2)) |
SUMPRODUCT(IFERROR(MOD(B1:B3,B1:B2),100)) | SUMPRODUCT(ABS(N1:N3)) | SUM(IFERROR(ABS(N1:N3),0)) |
SUMPRODUCT(IFERROR(ABS(N1:N3),0)) | SUMPRODUCT(ROUND(M1:M3,0)) |
SUMPRODUCT(IFERROR(ROUND(M1:M3,0),7)) | SUMPRODUCT(LEN(INDEX(M1:M3,{1;3})))
""",
    "|",
)

_PLACE = re.compile(r"\{([A-Z])\}")
_NAME = re.compile(r"\b([A-Z][A-Z0-9.]*)\(")


def data() -> dict[str, Any]:
    """The sheet."""
    return {
        f"{letter}{row}": value
        for letter, values in (COLUMNS | WHOLE).items()
        for row, value in enumerate(values, 1)
        if value is not None
    }


def places(sample: str) -> list[str]:
    """The columns of a sample, in order."""
    return _PLACE.findall(sample)


def over_ranges(sample: str, only: int | None = None) -> str:
    """The formula over all rows, in every argument or in one; the others take the first row."""
    count = iter(range(len(sample)))
    return _PLACE.sub(
        lambda match: f"{match[1]}$1:{match[1]}${ROWS}" if only in (None, next(count)) else f"{match[1]}$1",
        sample,
    )


def of_row(sample: str, row: int, only: int | None = None) -> str:
    """What :func:`over_ranges` gives in one row, as a formula of single cells."""
    count = iter(range(len(sample)))
    return _PLACE.sub(lambda match: f"{match[1]}${row if only in (None, next(count)) else 1}", sample)


def as_saved(formula: str) -> str:
    """A formula as a file has it, with the prefix of newer functions."""
    return _NAME.sub(lambda match: match[0] if match[1] in FORMULAE else "_xlfn." + match[0], formula)
