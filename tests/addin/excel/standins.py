"""Stand-ins for the modules of Windows, so that xlwings' own Windows code runs on any platform.

Only what lies below xlwings is replaced: pywin32 and a few DLL handles. The
code under test, ``xlwings/udfs.py``, ``xlwings/conversion`` and
``xlwings/com_server.py``, is the released one. To be imported in a process of
its own, because xlwings looks at the platform once and for all.
"""

from __future__ import annotations

# The standard library looks at the platform as well: what xlwings uses of it is loaded beforehand.
import asyncio  # noqa: F401
import atexit
import concurrent.futures.thread  # noqa: F401
import ctypes
import subprocess  # noqa: F401
import sys
import tempfile  # noqa: F401
import types
from typing import Any

import numpy  # noqa: F401

RANGE_IID = "{00020846-0000-0000-C000-000000000046}"
MISSING = -2147352572
"""What COM hands over for an argument that was left out (DISP_E_PARAMNOTFOUND)."""
ERRORS = {
    "#NULL!": -2146826288,
    "#DIV/0!": -2146826281,
    "#VALUE!": -2146826273,
    "#REF!": -2146826265,
    "#NAME?": -2146826259,
    "#NUM!": -2146826252,
    "#N/A": -2146826246,
}
"""What COM hands over for error cells: 0x800A0000 + the number of the error."""


class ComError(Exception):
    """Stands for pywintypes.com_error."""


class Anything:
    """Answers every attribute and call with another of its kind."""

    def __init__(self, **attributes: Any) -> None:
        self.__dict__.update(attributes)

    def __getattr__(self, name: str) -> Any:
        if name.startswith("__"):
            raise AttributeError(name)
        return Anything()

    def __call__(self, *args: Any, **kwargs: Any) -> Any:
        return Anything()


class ExcelRange:
    """A range as COM hands it over: xlwings knows it by the identifier in its type information."""

    def __init__(self, value: Any) -> None:
        self.Value = value
        attributes = Anything(iid=RANGE_IID)
        self._oleobj_ = Anything(GetTypeInfo=lambda: Anything(GetTypeAttr=lambda: attributes))
        rows = value if isinstance(value, tuple) else ((value,),)
        self.Row = self.Column = 1
        self.Rows, self.Columns = Anything(Count=len(rows)), Anything(Count=len(rows[0]))
        self.Worksheet = Anything(Parent=Anything(Application=Anything()))


def load_xlwings() -> Any:
    """Import xlwings as Windows would have it."""

    def module(name: str, **attributes: Any) -> Any:
        made = types.ModuleType(name)
        made.__dict__.update(attributes)
        made.__file__ = f"{name}.py"
        sys.modules[name] = made
        return made

    class Dispatched:
        """Base of the classes of COM objects; none of our stand-ins is one."""

    class Time:
        """Stands for pywintypes.TimeType."""

    def refuse(value: Any) -> Any:
        raise ComError("not an object of ours")

    module("pywintypes", com_error=ComError, error=ComError, IID=str, TimeType=Time)
    module(
        "pythoncom",
        com_error=ComError,
        ole_error=ComError,
        IID_IDispatch="dispatch",
        IID_IEnumVARIANT="enum",
        TypeIIDs={"dispatch": Dispatched},
        CoInitialize=lambda: None,
    )
    for name in ("win32api", "win32con", "win32gui", "win32event", "win32timezone"):
        module(name)
    module("win32process", GetWindowThreadProcessId=lambda window: (0, 1))
    client = module(
        "win32com.client",
        CDispatch=Dispatched,
        CoClassBaseClass=type("CoClassBaseClass", (), {}),
        DispatchBaseClass=type("DispatchBaseClass", (), {}),
        Dispatch=lambda thing, **kwargs: thing,
        DispatchEx=lambda thing, **kwargs: thing,
    )
    client.gencache = module("win32com.client.gencache", EnsureModule=lambda *a, **k: None)
    client.dynamic = module("win32com.client.dynamic")
    util = module("win32com.server.util", unwrap=refuse, wrap=lambda thing, **kwargs: thing)
    policy = module("win32com.server.policy")
    dispatcher = module("win32com.server.dispatcher")
    exception = module("win32com.server.exception")
    server = module(
        "win32com.server", util=util, policy=policy, dispatcher=dispatcher, exception=exception, __path__=[]
    )
    module("win32com", client=client, server=server, __path__=[])
    vars(ctypes).update(windll=Anything(), oledll=Anything())
    real_dll, ctypes.PyDLL = ctypes.PyDLL, Anything()  # type: ignore[misc, assignment]
    platform, sys.platform = sys.platform, "win32"
    try:
        import xlwings
        import xlwings._xlwindows
        import xlwings.udfs
    finally:
        sys.platform, ctypes.PyDLL = platform, real_dll  # type: ignore[misc]
    atexit.unregister(xlwings._xlwindows.cleanup)
    return xlwings
