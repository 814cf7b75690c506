"""Windows without Windows: enough of pywin32 and of ctypes for xlwings' real server, udfs and conversion to load.

It changes the process that it runs in for good, so that tests run it in one of their own.
"""

from __future__ import annotations

import asyncio  # noqa: F401  loaded before the platform is pretended, as are those that xlwings would load later
import concurrent.futures  # noqa: F401
import ctypes
import datetime
import subprocess  # noqa: F401
import sys
import tempfile  # noqa: F401
import types
from typing import Any

import numpy as np  # noqa: F401
import pandas as pd  # noqa: F401

STUBBED = (
    "pythoncom", "pywintypes", "win32api", "win32con", "win32event", "win32gui", "win32process", "win32timezone",
    "win32com", "win32com.client", "win32com.client.gencache", "win32com.server", "win32com.server.dispatcher",
    "win32com.server.exception", "win32com.server.policy", "win32com.server.util",
)
RANGE_IID = "{00020846-0000-0000-C000-000000000046}"
MISSING = -2147352572  # DISP_E_PARAMNOTFOUND, as VBA hands an omitted argument over


class ComObject:
    """A bare COM object as pywin32 hands it to a server; Dispatch wraps it."""

    def __init__(self, target: object):
        self.target = target

    def GetTypeInfo(self):
        documentation = types.SimpleNamespace(GetDocumentation=lambda place: ("Range", "", 0, ""))
        documentation.GetTypeAttr = lambda: types.SimpleNamespace(iid=RANGE_IID)
        return documentation


def dispatch(found: Any, userName: str | None = None, **more: object) -> object:
    """As win32com.client.Dispatch."""
    return found.target if isinstance(found, ComObject) else found


class _Anything:
    """What is asked for while modules load, and never used."""

    def __getattr__(self, name: str) -> _Anything:
        if name.startswith("__"):
            raise AttributeError(name)
        return _Anything()

    def __call__(self, *args: object, **options: object) -> _Anything:
        return _Anything()


class _Stub(types.ModuleType):
    def __getattr__(self, name: str) -> object:
        if name.startswith("__"):
            raise AttributeError(name)
        return _Anything()


def _unwrap(found: object) -> object:
    raise ValueError("no object of this server")


def _stubs() -> dict[str, types.ModuleType]:
    made = {name: _Stub(name) for name in STUBBED}
    for name in STUBBED:
        parent, _, own = name.rpartition(".")
        if parent:
            setattr(made[parent], own, made[name])
    made["win32com"].__path__ = made["win32com.client"].__path__ = made["win32com.server"].__path__ = []
    com = made["pythoncom"]
    com.IID_IDispatch, com.TypeIIDs, com.__file__ = "IDispatch", {"IDispatch": ComObject}, "pythoncom.dll"
    types_of_windows = made["pywintypes"]
    types_of_windows.TimeType, types_of_windows.IID = datetime.datetime, str
    types_of_windows.com_error = type("com_error", (Exception,), {"hresult": -2147352567, "excepinfo": None})
    types_of_windows.error = type("error", (Exception,), {})
    client = made["win32com.client"]
    client.Dispatch = client.DispatchEx = dispatch
    client.CDispatch = client.CoClassBaseClass = client.DispatchBaseClass = type("CDispatch", (), {})
    for name in ("MB_OK", "MB_ICONINFORMATION", "MB_ICONWARNING"):
        setattr(made["win32con"], name, 0)
    made["win32process"].GetWindowThreadProcessId = lambda window: (1, 4711)
    made["win32com.server.util"].wrap = lambda found, *args, **more: found
    made["win32com.server.util"].unwrap = _unwrap
    made["win32timezone"].TimeZoneInfo = types.SimpleNamespace(utc=lambda: datetime.UTC)
    return made


def stub(name: str) -> Any:
    """A module of pywin32, to give it what a test needs."""
    return sys.modules[name]


def load_xlwings() -> Any:
    """Import xlwings as on Windows."""
    sys.modules.update(_stubs())
    for name in ("windll", "oledll"):
        setattr(ctypes, name, _Anything())
    ctypes.PyDLL = _Anything()  # type: ignore[assignment,misc]
    platform, sys.platform = sys.platform, "win32"
    try:
        import xlwings
        import xlwings.com_server
        import xlwings.udfs
    finally:
        sys.platform = platform
    assert xlwings.func is xlwings.udfs.xlfunc
    return xlwings
