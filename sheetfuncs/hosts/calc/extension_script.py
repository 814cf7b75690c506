"""Run by a Python that knows UNO, never imported: `python extension_script.py ADDRESS add FILE | remove | list`.

Prints "connected" and goes on at the next line of its input, since the program that answers may be one that somebody
works in: then the input ends. Then prints one line of JSON: {"registered": version or null, "folder": path or null}, or
{"trouble": sentence}. Standard library and uno only, and nothing newer than Python 3.8.
"""

import json
import sys
import time
from contextlib import suppress

import uno
import unohelper
from com.sun.star.task import XInteractionHandler
from com.sun.star.ucb import XCommandEnvironment
from com.sun.star.uno import Exception as UnoException

IDENTIFIER = "org.sheetfuncs.calc"
SECONDS = 60


def connect(address):
    """The component context of the office that is starting."""
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
    until = time.monotonic() + SECONDS
    while True:
        try:
            context = resolver.resolve(address)
            context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
            return context
        except UnoException:  # not there yet; or there, and about to start again, as in a new profile
            if time.monotonic() > until:
                raise
            time.sleep(0.1)


class Approving(unohelper.Base, XCommandEnvironment, XInteractionHandler):
    """Says yes to what LibreOffice asks on the way: this extension over an older one of ours."""

    def getInteractionHandler(self):
        return self

    def getProgressHandler(self):
        return None

    def handle(self, request):
        for continuation in request.getContinuations():
            approve = continuation.queryInterface(uno.getTypeByName("com.sun.star.task.XInteractionApprove"))
            if approve is not None:
                approve.select()


def registered(manager):
    """The extension as the user has it, or None."""
    packages = manager.getDeployedExtensions("user", manager.createAbortChannel(), None)
    return next((one for one in packages if one.Identifier.Value == IDENTIFIER), None)


def run(context, action, *files):
    """Do it, and say what is there afterwards."""
    manager = context.getValueByName("/singletons/com.sun.star.deployment.ExtensionManager")
    found = registered(manager)
    if action in ("add", "remove") and found is not None:
        manager.removeExtension(IDENTIFIER, found.getName(), "user", manager.createAbortChannel(), Approving())
    if action == "add":
        url = uno.systemPathToFileUrl(files[0])
        manager.addExtension(url, (), "user", manager.createAbortChannel(), Approving())
    found = registered(manager)
    if found is None:
        return {"registered": None, "folder": None}
    packages = context.getValueByName("/singletons/com.sun.star.deployment.PackageInformationProvider")
    url = packages.getPackageLocation(IDENTIFIER)
    return {"registered": found.getVersion(), "folder": uno.fileUrlToSystemPath(url) if url else None}


def innermost(trouble):
    """What lies behind an exception of LibreOffice, in one line."""
    try:
        while trouble.Cause is not None:
            trouble = trouble.Cause
    except Exception:
        pass  # not every cause can be had through the bridge
    message = str(getattr(trouble, "Message", trouble)).strip()
    return message.splitlines()[0] if message else type(trouble).__name__


def main(address, *arguments):
    """Connect, act, print, and ask the office to end."""
    context = connect(address)
    print("connected", flush=True)
    if sys.stdin.readline().strip() != "go":
        return
    try:
        print(json.dumps(run(context, *arguments)))
    except Exception as trouble:
        print(json.dumps({"trouble": innermost(trouble)}))
    desktop = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
    with suppress(Exception):  # it may close the connection before it answers
        desktop.terminate()


if __name__ == "__main__":
    main(*sys.argv[1:])
