"""Where the functions of a spreadsheet take a single value, and where they take a range as it is.

Compared with LibreOffice, function by function.
"""

from __future__ import annotations

from typing import Final


def words(text: str) -> frozenset[str]:
    """The words of a text, as a set of names."""
    return frozenset(text.split())


# Every argument is a single value.
ALL_SINGLE: Final = words(
    """
    ABS ACCRINT ACCRINTM ACOS ACOSH ACOT ACOTH ADDRESS ARABIC ASC ASIN ASINH ATAN ATANH BASE BESSELI BESSELJ
    BESSELK BESSELY BETA.DIST BETA.INV BETADIST BETAINV BIN2DEC BIN2HEX BIN2OCT BINOM.DIST BINOM.DIST.RANGE
    BINOM.INV BINOMDIST BITAND BITLSHIFT BITOR BITRSHIFT BITXOR CEILING CEILING.MATH CEILING.PRECISE CHAR
    CHIDIST CHIINV CHISQ.DIST CHISQ.DIST.RT CHISQ.INV CHISQ.INV.RT CLEAN CODE COMBIN COMBINA COMPLEX
    CONCATENATE CONFIDENCE CONFIDENCE.NORM CONFIDENCE.T CONVERT COSH COT COTH CRITBINOM CSC CSCH CUMIPMT
    CUMPRINC DATE DATEDIF DATEVALUE DAY DAYS DAYS360 DB DDB DEC2BIN DEC2HEX DEC2OCT DECIMAL DEGREES DELTA
    DOLLAR DOLLARDE DOLLARFR EDATE EFFECT EOMONTH ERF ERF.PRECISE ERFC ERFC.PRECISE ERROR.TYPE EVEN EXACT EXP
    EXPON.DIST EXPONDIST F.DIST F.DIST.RT F.INV F.INV.RT FACT FACTDOUBLE FDIST FIND FINDB FINV FISHER
    FISHERINV FIXED FLOOR FLOOR.MATH FLOOR.PRECISE FV GAMMA GAMMA.DIST GAMMA.INV GAMMADIST GAMMAINV GAMMALN
    GAMMALN.PRECISE GAUSS GESTEP HEX2BIN HEX2DEC HEX2OCT HOUR HYPGEOM.DIST HYPGEOMDIST IMABS IMAGINARY
    IMARGUMENT IMCONJUGATE IMCOS IMCOSH IMCOT IMCSC IMDIV IMEXP IMLN IMLOG10 IMLOG2 IMPOWER IMREAL IMSEC
    IMSIN IMSINH IMSQRT IMSUB IMTAN INT IPMT ISBLANK ISERR ISERROR ISEVEN ISLOGICAL ISNA ISNONTEXT ISNUMBER
    ISO.CEILING ISODD ISOWEEKNUM ISPMT ISTEXT LEFT LEFTB LEN LENB LN LOG LOG10 LOGINV LOGNORM.DIST
    LOGNORM.INV LOGNORMDIST LOWER MID MIDB MINUTE MOD MONTH MROUND N NEGBINOM.DIST NEGBINOMDIST NOMINAL
    NORM.DIST NORM.INV NORM.S.DIST NORM.S.INV NORMDIST NORMINV NORMSDIST NORMSINV NOT NPER NUMBERVALUE
    OCT2BIN OCT2DEC OCT2HEX ODD PDURATION PERMUT PHI PMT POISSON POISSON.DIST POWER PPMT PRICE PROPER PV
    QUOTIENT RADIANS RANDBETWEEN RATE REPLACE REPLACEB REPT RIGHT RIGHTB ROMAN ROUND ROUNDDOWN ROUNDUP RRI
    SEARCH SEARCHB SEC SECH SECOND SIGN SINH SLN SQRT SQRTPI STANDARDIZE SUBSTITUTE SYD T T.DIST T.DIST.2T
    T.DIST.RT T.INV T.INV.2T TANH TBILLEQ TBILLPRICE TBILLYIELD TDIST TEXT TEXTAFTER TEXTBEFORE TIME
    TIMEVALUE TINV TRIM TRUNC UNICHAR UNICODE UPPER VALUE VALUETOTEXT WEEKDAY WEEKNUM WEIBULL WEIBULL.DIST
    YEAR YEARFRAC YIELD
    """
)

# Of the others, the positions that take a single value.
_SOME: Final[dict[str, frozenset[int]]] = {
    name: frozenset(map(int, positions.split()))
    for positions, names in (
        ("0", "FORECAST FORECAST.LINEAR LOOKUP NPV TEXTJOIN XLOOKUP XMATCH XNPV"),
        ("1", "AVERAGEIF COUNTIF LARGE PERCENTILE PERCENTILE.EXC PERCENTILE.INC QUARTILE QUARTILE.EXC"),
        ("1", "QUARTILE.INC SMALL SUMIF TRIMMEAN"),
        ("0 1", "NETWORKDAYS WORKDAY"),
        ("0 1 2", "NETWORKDAYS.INTL SERIESSUM WORKDAY.INTL"),
        ("0 2", "MATCH RANK RANK.AVG RANK.EQ"),
        ("0 2 3", "HLOOKUP VLOOKUP"),
        ("1 2", "INDEX MIRR PERCENTRANK PERCENTRANK.EXC PERCENTRANK.INC Z.TEST ZTEST"),
        ("1 2 3 4", "OFFSET"),
        ("0", "CHOOSE IF IFERROR IFNA INDIRECT SUBTOTAL"),
        ("0 1 3", "AGGREGATE"),
    )
    for name in names.split()
}
# Pairs of a range and a criterion; the number of arguments that come before them.
_PAIRS: Final = {"COUNTIFS": 0, "SUMIFS": 1, "AVERAGEIFS": 1, "MAXIFS": 1, "MINIFS": 1}

# A single value is meant, and the evaluator itself goes through a range.
BY_ITSELF: Final = words("ATAN2 COS IF IFERROR IFNA SIN TAN")
# They hand on one of their arguments, range or not.
CHOOSES: Final = words("CHOOSE IF IFERROR IFNA IFS SWITCH")
# Of these, the ones that in an array formula go through the ranges among their results as well.
ALL_ALONG: Final = words("IFS SWITCH")
# They refer to cells, one or several.
REFERS: Final = words("INDEX INDIRECT OFFSET")
# Several values at a time mean something that cannot be had one by one.
NEVER_EACH: Final = words("AGGREGATE INDIRECT OFFSET SUBTOTAL TEXTJOIN")
# They may hand on an empty cell.
HANDS_ON: Final = CHOOSES | words("HLOOKUP INDEX LOOKUP VLOOKUP XLOOKUP")
# Spreadsheets disagree about a range as that argument in a plain formula; for the last two
# not about an expression with ranges.
DISPUTED: Final = {"LARGE": 1, "SMALL": 1, "IFERROR": 0, "IFNA": 0}

# One value is made of ranges.
REDUCES: Final = words(
    """
    AGGREGATE AND AVEDEV AVERAGE AVERAGEA COLUMNS CONCAT COUNT COUNTA COUNTBLANK DEVSQ GCD GEOMEAN HARMEAN
    IMPRODUCT IMSUM IRR KURT LCM MAX MAXA MEDIAN MIN MINA MULTINOMIAL OR PRODUCT ROWS SKEW SKEW.P STDEV
    STDEV.P STDEV.S STDEVA STDEVP STDEVPA SUBTOTAL SUM SUMSQ VAR VAR.P VAR.S VARA VARP VARPA XIRR XOR
    """
)
# The same, and every argument is worked as an array in a plain formula, too.
REDUCES_ARRAYS: Final = words(
    """
    CHISQ.TEST CHITEST CORREL COVAR COVARIANCE.P COVARIANCE.S F.TEST FTEST INTERCEPT MDETERM MODE MODE.SNGL
    PEARSON RSQ SLOPE STEYX SUMPRODUCT SUMX2MY2 SUMX2PY2 SUMXMY2 T.TEST TTEST
    """
)
_ARRAYS_AT: Final[dict[str, frozenset[int]]] = {
    "FORECAST": frozenset((1, 2)),
    "FORECAST.LINEAR": frozenset((1, 2)),
    "AGGREGATE": frozenset((2,)),
    "HLOOKUP": frozenset((1,)),
    "INDEX": frozenset((0,)),
    "LOOKUP": frozenset((1, 2)),
    "MATCH": frozenset((1,)),
    "VLOOKUP": frozenset((1,)),
    "XLOOKUP": frozenset((1, 2)),
    "XMATCH": frozenset((1,)),
}
_NOWHERE: Final[frozenset[int]] = frozenset()


def single_values(name: str, count: int) -> frozenset[int]:
    """The positions, counted from 0, at which a call with so many arguments takes a single value."""
    if name in ALL_SINGLE or name in BY_ITSELF - CHOOSES:
        return frozenset(range(count))
    if name in _PAIRS:
        return frozenset(range(_PAIRS[name] + 1, count, 2))
    if name == "IFS":
        return frozenset(range(0, count, 2))
    if name == "SWITCH":
        return frozenset((0, *range(1, count - 1, 2)))
    return frozenset(position for position in _SOME.get(name, _NOWHERE) if position < count)


def one_by_one(name: str, count: int) -> frozenset[int]:
    """The positions that go along when a call is worked value by value."""
    return frozenset(range(count)) if name in CHOOSES else single_values(name, count)


def arrays(name: str) -> frozenset[int]:
    """The positions that are worked as arrays in a plain formula, too."""
    return _ARRAYS_AT.get(name, _NOWHERE)
