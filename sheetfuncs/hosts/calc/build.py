"""The extension as one file, made from the registry of functions: the same bytes for the same settings.

No development kit is needed: the type library is text, which LibreOffice reads as it is.
"""

from __future__ import annotations

import io
import json
import zipfile
from collections.abc import Mapping
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

from sheetfuncs import __version__
from sheetfuncs.functions.arguments import Argument
from sheetfuncs.functions.declaration import WorksheetFunction
from sheetfuncs.functions.registry import REGISTRY

IDENTIFIER = "org.sheetfuncs.calc"
SERVICE = f"{IDENTIFIER}.Functions"
SHEETS = "com.sun.star.sheet.SpreadsheetDocument"
COMMANDS = {
    "check": "Check the selection",
    "again": "Check again",
    "why": "Why this value?",
    "health": "Health",
}
TITLE = "Regression check"
EVENTS = ("OnLoadFinished", "OnSaveDone", "OnSaveAsDone", "OnUnload")
SOURCES = Path(__file__).parent
EARLIEST = (1980, 1, 1, 0, 0, 0)


def build_extension(settings: Mapping[str, object] | None = None) -> bytes:
    """The bytes of the .oxt. settings: interpreter, package_folder, version, seconds, for the bridge."""
    files = {
        "META-INF/manifest.xml": _manifest(),
        "description.xml": _description(),
        "functions.idl": type_library(),
        "CalcAddIns.xcu": _function_texts(),
        "Addons.xcu": _menu_and_toolbar(),
        "CalcWindowState.xcu": _toolbar_place(),
        "Jobs.xcu": _jobs(),
        "ProtocolHandler.xcu": _protocol_handler(),
        "functions.json": json.dumps(_functions(), indent=1),
        "settings.json": json.dumps(dict(settings or {}), indent=1, sort_keys=True),
        "component.py": (SOURCES / "bridge" / "component.py").read_text("utf-8"),
        **{f"pythonpath/sheetfuncs_bridge/{path.name}": path.read_text("utf-8") for path in _bridge_modules()},
    }
    buffer = io.BytesIO()
    with zipfile.ZipFile(buffer, "w", zipfile.ZIP_DEFLATED) as package:
        for name, text in files.items():
            entry = zipfile.ZipInfo(name, EARLIEST)
            entry.compress_type, entry.external_attr = zipfile.ZIP_DEFLATED, 0o644 << 16
            package.writestr(entry, text)
    return buffer.getvalue()


def method_name(name: str) -> str:
    """The name of a function's method: "fitDurbinWatson" for FIT_DURBIN_WATSON."""
    first, *rest = name.lower().split("_")
    return first + "".join(part.capitalize() for part in rest)


def programmatic_name(name: str) -> str:
    """The name by which LibreOffice knows a function inside files."""
    return f"{SERVICE}.{method_name(name)}"


def gives_matrix(function: WorksheetFunction) -> bool:
    """Whether the function's value is rows of cells."""
    return function.returns in ("column", "table")


def type_library() -> str:
    """The interface of the add-in, in the language of LibreOffice's type descriptions.

    Data are ranges, needed numbers doubles; what may be left out is `any`, the only type taken as optional. The
    first parameter, which no one sees, is the document that the call comes from.
    """
    lines = ["module org { module sheetfuncs { module calc {", "interface XFunctions {"]
    for function in REGISTRY.values():
        result = "sequence< sequence<any> >" if gives_matrix(function) else "any"
        parameters = ["[in] com::sun::star::beans::XPropertySet document"]
        parameters += [f"[in] {_type(one)} {_parameter(one)}" for one in function.arguments]
        lines.append(f"  {result} {method_name(function.name)}({', '.join(parameters)});")
    return "\n".join([*lines, "};", "}; }; };", ""])


def _type(argument: Argument) -> str:
    if argument.optional:
        return "any"
    return "com::sun::star::table::XCellRange" if argument.kind == "range" else "double"


def _parameter(argument: Argument) -> str:
    first, *rest = argument.name.split("_")
    return "the" + "".join(part.capitalize() for part in (first, *rest))  # never a reserved word


def _functions() -> list[dict[str, object]]:
    return [
        {"name": one.name, "method": method_name(one.name), "matrix": gives_matrix(one)} for one in REGISTRY.values()
    ]


def _bridge_modules() -> list[Path]:
    modules = [path for path in (SOURCES / "bridge").glob("*.py") if path.name != "component.py"]
    spellings = SOURCES.parents[1] / "functions" / "spellings.py"
    return sorted([*modules, SOURCES / "protocol.py", spellings], key=lambda path: path.name)


_XML = '<?xml version="1.0" encoding="UTF-8"?>\n'
_OOR = 'xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema"'


def _manifest() -> str:
    kinds = {
        "functions.idl": "application/vnd.sun.star.uno-typelibrary;type=RDB",
        "component.py": "application/vnd.sun.star.uno-component;type=Python",
        **dict.fromkeys(
            ("CalcAddIns.xcu", "Addons.xcu", "CalcWindowState.xcu", "Jobs.xcu", "ProtocolHandler.xcu"),
            "application/vnd.sun.star.configuration-data",
        ),
    }
    entries = "".join(
        f' <manifest:file-entry manifest:media-type="{kind}" manifest:full-path="{name}"/>\n'
        for name, kind in kinds.items()
    )
    return (
        f'{_XML}<manifest:manifest xmlns:manifest="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0">\n'
        f"{entries}</manifest:manifest>\n"
    )


def _description() -> str:
    return (
        f'{_XML}<description xmlns="http://openoffice.org/extensions/description/2006"'
        ' xmlns:d="http://openoffice.org/extensions/description/2006" xmlns:xlink="http://www.w3.org/1999/xlink">\n'
        f' <identifier value="{IDENTIFIER}"/>\n <version value="{__version__}"/>\n'
        ' <dependencies><d:OpenOffice.org-minimal-version value="4.0" d:name="LibreOffice 7"/></dependencies>\n'
        " <display-name><name>sheetfuncs: regression diagnostics</name></display-name>\n</description>\n"
    )


def _data(name: str, package: str, body: str) -> str:
    return f'{_XML}<oor:component-data {_OOR} oor:name="{name}" oor:package="{package}">\n{body}</oor:component-data>\n'


def _node(name: str, body: str) -> str:
    return f'<node oor:name={quoteattr(name)} oor:op="replace">\n{body}</node>\n'


def _group(name: str, body: str) -> str:
    return f'<node oor:name="{name}">\n{body}</node>\n'


def _property(name: str, value: str, *, language: bool = False) -> str:
    tongue = ' xml:lang="en"' if language else ""
    return f'<prop oor:name="{name}"><value{tongue}>{escape(value)}</value></prop>\n'


def _function_texts() -> str:
    functions = "".join(_node(method_name(one.name), _function_text(one)) for one in REGISTRY.values())
    add_in = _node(SERVICE, _group("AddInFunctions", functions))
    return _data("CalcAddIns", "org.openoffice.Office", _group("AddInInfo", add_in))


def _function_text(function: WorksheetFunction) -> str:
    parameters = "".join(
        _node(
            _parameter(one),
            _property("DisplayName", one.name, language=True) + _property("Description", one.help, language=True),
        )
        for one in function.arguments
    )
    return (
        _property("DisplayName", function.name, language=True)
        + _property("Description", function.summary, language=True)
        + _property("Category", "Statistical")
        + _property("CompatibilityName", function.name, language=True)
        + _group("Parameters", parameters)
    )


def _menu_and_toolbar() -> str:
    entries = "".join(
        _node(
            f"entry{place}",
            _property("URL", f"{IDENTIFIER}:{command}") + _property("Title", label, language=True)
            + _property("Target", "_self") + _property("Context", SHEETS),
        )
        for place, (command, label) in enumerate(COMMANDS.items())
    )
    menu = _node(
        f"{IDENTIFIER}.menu",
        _property("Title", TITLE, language=True) + _property("Context", SHEETS)
        + _group("Submenu", entries),
    )
    toolbar = _node(f"{IDENTIFIER}.toolbar", entries)
    surface = _group("OfficeMenuBar", menu) + _group("OfficeToolBar", toolbar)
    return _data("Addons", "org.openoffice.Office", _group("AddonUI", surface))


def _toolbar_place() -> str:
    """Below the other toolbars and with a name; without this it floats over the menus as "Add-On 1"."""
    state = _node(
        f"private:resource/toolbar/addon_{IDENTIFIER}.toolbar",
        _property("UIName", TITLE, language=True) + _property("Docked", "true") + _property("DockingArea", "0")
        + _property("DockPos", "0,4") + _property("Visible", "true"),
    )
    return _data("CalcWindowState", "org.openoffice.Office.UI", _group("UIElements", _group("States", state)))


def _jobs() -> str:
    name = "SheetfuncsDocument"
    job = _node(name, _property("Service", f"{IDENTIFIER}.DocumentJob"))
    listed = _group("JobList", _node(name, ""))
    events = "".join(f'<node oor:name="{event}" oor:op="fuse">\n{listed}</node>\n' for event in EVENTS)
    return _data("Jobs", "org.openoffice.Office", _group("Jobs", job) + _group("Events", events))


def _protocol_handler() -> str:
    handler = _node(
        f"{IDENTIFIER}.Commands",
        f'<prop oor:name="Protocols"><value>{IDENTIFIER}:*</value></prop>\n',
    )
    return _data("ProtocolHandler", "org.openoffice.Office", _group("HandlerSet", handler))
