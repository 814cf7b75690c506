"""What LibreOffice loads: the add-in with all functions, the commands of menu and toolbar, and the document job.

functions.json beside this file, made from the registry at build time, says which functions there are.
"""

from __future__ import annotations

import json
from pathlib import Path

import unohelper
from com.sun.star.frame import DispatchResultEvent, XDispatchProvider, XNotifyingDispatch, XTerminateListener
from com.sun.star.frame.DispatchResultState import FAILURE, SUCCESS
from com.sun.star.lang import XInitialization, XLocalizable, XServiceInfo, XServiceName
from com.sun.star.task import XJob
from org.sheetfuncs.calc import XFunctions
from sheetfuncs_bridge import calls, client
from sheetfuncs_bridge.recalculation import Recalculation

FUNCTIONS_NAME = "org.sheetfuncs.calc.Functions"
COMMANDS_NAME = "org.sheetfuncs.calc.Commands"
DOCUMENT_JOB_NAME = "org.sheetfuncs.calc.DocumentJob"
PROTOCOL = "org.sheetfuncs.calc:"
FUNCTIONS = json.loads((Path(__file__).parent / "functions.json").read_text("utf-8"))


class Functions(unohelper.Base, XFunctions, XServiceName, XServiceInfo, XLocalizable):
    """The worksheet functions; their methods are added below, one a function of functions.json."""

    def __init__(self, context):
        self.context = context
        self.recalculation = Recalculation(context)
        self.locale = None
        _close_with_the_office(context)

    def getServiceName(self):
        return FUNCTIONS_NAME

    def getImplementationName(self):
        return FUNCTIONS_NAME

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return FUNCTIONS_NAME, "com.sun.star.sheet.AddIn"

    def setLocale(self, locale):
        self.locale = locale

    def getLocale(self):
        return self.locale


def _method(name: str, shaped):
    def method(self, document, *given):
        return shaped(calls.call(self.recalculation, document, name, given))

    return method


for _function in FUNCTIONS:
    setattr(
        Functions, _function["method"],
        _method(_function["name"], calls.as_matrix if _function["matrix"] else calls.as_scalar),
    )


class Commands(unohelper.Base, XDispatchProvider, XNotifyingDispatch, XInitialization, XServiceInfo):
    """The entries of menu and toolbar."""

    def __init__(self, context):
        self.context = context
        self.frame = None

    def initialize(self, arguments):
        self.frame = arguments[0] if arguments else None

    def queryDispatch(self, url, target, flags):
        return self if url.Complete.startswith(PROTOCOL) else None

    def queryDispatches(self, requests):
        return tuple(self.queryDispatch(one.FeatureURL, one.FrameName, one.SearchFlags) for one in requests)

    def dispatch(self, url, arguments):
        self._run(url, None)

    def dispatchWithNotification(self, url, arguments, listener):
        """For a caller that wants the outcome, such as a macro: it gets the sentence, and no box is shown."""

        def done(succeeded, text):
            listener.dispatchFinished(DispatchResultEvent(self, SUCCESS if succeeded else FAILURE, text))

        self._run(url, done if listener is not None else None)

    def _run(self, url, done):
        from sheetfuncs_bridge import button

        command = {
            "check": button.check_selection, "again": button.check_again, "why": button.why_this_value,
            "health": button.show_health, "show": button.show_sheet,
        }.get(url.Complete[len(PROTOCOL):])
        if command is not None:
            command(self.context, self.frame, done)

    def addStatusListener(self, listener, url):
        pass  # the entries are always enabled; a selection that makes no sense gets a sentence

    def removeStatusListener(self, listener, url):
        pass

    def getImplementationName(self):
        return COMMANDS_NAME

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return COMMANDS_NAME, "com.sun.star.frame.ProtocolHandler"


class DocumentJob(unohelper.Base, XJob, XServiceInfo):
    """Called when a document was loaded or saved."""

    def __init__(self, context):
        self.context = context

    def execute(self, arguments):
        from sheetfuncs_bridge import jobs

        groups = {one.Name: one.Value for one in arguments}
        environment = {one.Name: one.Value for one in groups.get("Environment", ())}
        model = environment.get("Model")
        if model is not None:
            jobs.on_event(self.context, environment.get("EventName", ""), model)
        return ()

    def getImplementationName(self):
        return DOCUMENT_JOB_NAME

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return DOCUMENT_JOB_NAME, "com.sun.star.task.Job"


class _Closer(unohelper.Base, XTerminateListener):
    def queryTermination(self, event):
        pass

    def notifyTermination(self, event):
        client.close_workers()

    def disposing(self, event):
        client.close_workers()


def _close_with_the_office(context) -> None:
    manager = context.getServiceManager()
    manager.createInstanceWithContext("com.sun.star.frame.Desktop", context).addTerminateListener(_Closer())


g_ImplementationHelper = unohelper.ImplementationHelper()
for _class, _name, _service in (
    (Functions, FUNCTIONS_NAME, "com.sun.star.sheet.AddIn"),
    (Commands, COMMANDS_NAME, "com.sun.star.frame.ProtocolHandler"),
    (DocumentJob, DOCUMENT_JOB_NAME, "com.sun.star.task.Job"),
):
    g_ImplementationHelper.addImplementation(_class, _name, (_name, _service))
