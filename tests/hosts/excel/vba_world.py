"""What the add-in's VBA finds around it, played by small objects: Excel, workbooks, the Python process.

Our own sources run as they are in the add-in, in the interpreter of pyopenvba.
"""

from __future__ import annotations

from pyopenvba.interpreter import NOTHING, HostBridge, Interpreter, VBAArray, VBAObject, member, method, setter
from pyopenvba.interpreter._preprocess import strip_directives
from pyopenvba.interpreter._runtime import UNRESOLVED

from sheetfuncs.hosts.excel.vba_project import modules

MODULES = {module.name: module for module in modules("0.37.8")}
XL_CONSTANTS = {
    "xlerrnull": 2000, "xlerrdiv0": 2007, "xlerrvalue": 2015, "xlerrref": 2023, "xlerrname": 2029, "xlerrnum": 2036,
    "xlerrna": 2042, "xlexcellinks": 1, "xllinktypeexcellinks": 1,
}


class Python(VBAObject):
    """The Python process as VBA sees it; it answers what the test tells it to."""

    vba_type_name = "Python"

    def __init__(self, answer=None):
        self.answer, self.calls, self.statements = answer, [], []

    @method(name="CallUDF")
    def call_udf(self, module, name, arguments):
        self.calls.append((module, name, list(arguments.items)))
        if isinstance(self.answer, Exception):
            raise self.answer
        return self.answer

    @method(name="Module")
    def module(self, name):
        return name

    @method(name="SetAttr")
    def set_attr(self, owner, name, value):
        self.statements.append((owner, name, value))

    @method(name="Exec")
    def exec_(self, statement):
        if isinstance(self.answer, Exception):
            raise self.answer
        self.statements.append(statement)


class Link(VBAObject):
    vba_type_name = "PythonLink"

    def __init__(self, python):
        self.python = python

    @method(name="Server")
    def server(self):
        return self.python

    @method(name="Perform")
    def perform(self, statement):
        self.python.exec_(statement)


class Application(VBAObject):
    vba_type_name = "Application"

    def __init__(self):
        self.described, self.status, self.updating = [], "busy", False

    @method(name="MacroOptions")
    def macro_options(self, Macro, Description, Category, ArgumentDescriptions):  # names of Excel's
        self.described.append((Macro, Description, Category, list(ArgumentDescriptions.items)))

    @member(name="StatusBar")
    def status_bar(self):
        return self.status

    @setter("StatusBar")
    def set_status_bar(self, value):
        self.status = value

    @member(name="Path")
    def path(self):
        return "/Excel"

    @member(name="ScreenUpdating")
    def screen_updating(self):
        return self.updating

    @setter("ScreenUpdating")
    def set_screen_updating(self, value):
        self.updating = value


class Workbook(VBAObject):
    vba_type_name = "Workbook"

    def __init__(self, name, links=None):
        self.title, self.links, self.saved, self.changes = name, links, True, []

    @member(name="Name")
    def name(self):
        return self.title.rpartition("\\")[2] if self.title[1:3] == ":\\" else self.title

    @member(name="FullName")
    def full_name(self):
        return self.title

    @member(name="Saved")
    def is_saved(self):
        return self.saved

    @setter("Saved")
    def set_saved(self, value):
        self.saved = value

    @method(name="LinkSources")
    def link_sources(self, kind):
        return False if self.links is None else VBAArray([(1, len(self.links))], items=list(self.links))

    @method(name="ChangeLink")
    def change_link(self, name, new_name, kind):
        self.saved = False
        self.changes.append((name, new_name))


class Excel(HostBridge):
    """What the add-in finds around it: workbooks, the application, and a link to Python."""

    def __init__(self, python, active=NOTHING):
        self.application, self.link = Application(), Link(python)
        self.books = {"thisworkbook": Workbook("C:\\start\\sheetfuncs.xlam"), "activeworkbook": active}

    def global_object(self, name):
        return self.application if name.lower() == "application" else self.books.get(name.lower(), UNRESOLVED)

    def create(self, type_name):
        return self.link if type_name.lower() == "pythonlink" else UNRESOLVED

    def constant(self, name):
        return XL_CONSTANTS.get(name.lower(), UNRESOLVED)


def running(*names, python=None, active=NOTHING):
    excel = Excel(python or Python(), active)
    vba = Interpreter(excel)
    for name in names:
        vba.add_module(MODULES[name].source, name=name, kind="standard" if MODULES[name].kind == "module" else "class")
    return vba, excel


SYSTEMS = {
    "Windows, 64 bits": {}, "Windows, 32 bits": {"Win64": False},
    "macOS": {"Mac": True, "Win32": False, "Win64": False},
}


def as_compiled_on(system, name):
    """The lines that this system's editor compiles. The interpreter does not know the word WithEvents."""
    return strip_directives(MODULES[name].source.replace("WithEvents ", ""), constants=SYSTEMS[system])
