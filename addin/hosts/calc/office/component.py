"""The component that the office loads: worksheet functions, the menu command, the document listener.

It is copied to the root of the extension; the other files of this folder lie in its
``pythonpath``. Only the office's own Python and its ``uno`` module are needed.
"""

from __future__ import annotations

import gc
import sys
import traceback
from typing import Any

import uno
import unohelper
from com.sun.star.document import XDocumentEventListener
from com.sun.star.lang import XServiceInfo, XServiceName
from com.sun.star.task import XJobExecutor
from org.thrustbook.calc import XFunctions
from thrustbook_office import batch, books, link, settings

# A table comes as a hundred thousand tuples at once. Searching them for cycles while they
# are made takes as long as the making; it is put off, for all Python in the office.
gc.set_threshold(max(gc.get_threshold()[0], 200_000), *gc.get_threshold()[1:])

_SETTINGS = settings.read()
_LINK = link.Link(link.worker_command(_SETTINGS["python"]))
_CALLER = link.Caller(_LINK)


class _Service(unohelper.Base, XServiceInfo):
    """What every service of the component answers about itself."""

    NAME = ""
    SERVICES: tuple[str, ...] = ()

    def __init__(self, context: Any, *_arguments: Any) -> None:
        self._context = context
        _Listener.register(context)

    def getImplementationName(self) -> str:
        return self.NAME

    def supportsService(self, name: str) -> bool:
        return name in self.SERVICES

    def getSupportedServiceNames(self) -> Any:
        return self.SERVICES


class _Listener(unohelper.Base, XDocumentEventListener):
    """Hears of every document of the office that is loaded or saved."""

    _registered = False

    @classmethod
    def register(cls, context: Any) -> None:
        """Register once an office."""
        if cls._registered:
            return
        cls._registered = True
        try:
            broadcaster = context.getValueByName("/singletons/com.sun.star.frame.theGlobalEventBroadcaster")
            broadcaster.addDocumentEventListener(cls())
        except Exception:
            traceback.print_exc(file=sys.stderr)

    def documentEventOccured(self, event: Any) -> None:  # the office's own spelling
        try:
            trouble = books.after_event(
                event.EventName, event.Source, uno.fileUrlToSystemPath, _CALLER.plain_names
            )
            if trouble:
                _show(event.Source, "The functions in the saved file keep LibreOffice's names: " + trouble)
        except Exception:
            # An event of ours must never stand between the user and the document.
            traceback.print_exc(file=sys.stderr)

    def disposing(self, source: Any) -> None:
        type(self)._registered = False


class Functions(_Service, XServiceName, XFunctions):
    """The worksheet functions."""

    NAME = settings.FUNCTIONS
    SERVICES = (settings.FUNCTIONS, "com.sun.star.sheet.AddIn")

    def getServiceName(self) -> str:
        return settings.FUNCTIONS


def _method(name: str, repeats: bool, single: bool) -> Any:
    call = _CALLER.value if single else _CALLER.rows
    if repeats:

        def function(self: Any, *args: Any) -> Any:
            return call(name, args[:-1] + tuple(args[-1] or ()))

    else:

        def function(self: Any, *args: Any) -> Any:
            return call(name, args)

    function.__name__ = name
    return function


for _name, _repeats, _single in _SETTINGS["functions"]:
    setattr(Functions, _name, _method(_name, _repeats, _single))


class Relink(_Service, XJobExecutor):
    """The menu command: bind the functions of the workbook that is open."""

    NAME = settings.RELINK
    SERVICES = (settings.RELINK,)

    def trigger(self, _event: str) -> None:
        document = batch.desktop(self._context).getCurrentComponent()
        if not books.is_spreadsheet(document):
            return
        try:
            count = books.relink(document)
            document.calculateAll()
        except Exception as error:
            _show(document, f"The formulas could not be linked: {error}")
            return
        if count:
            formulas = "1 formula was" if count == 1 else f"{count} formulas were"
            _show(document, f"{formulas} linked to the functions of thrustbook.")


class Batch(_Service, XJobExecutor):
    """Evaluates a workbook for the command line, then ends the office."""

    NAME = settings.BATCH
    SERVICES = (settings.BATCH,)

    def trigger(self, event: str) -> None:
        batch.run(self._context, event)


def _show(document: Any, text: str) -> None:
    """Show a message, where there is a window to show it in."""
    controller: Any | None = document.getCurrentController()
    frame = None if controller is None else controller.getFrame()
    window = None if frame is None else frame.getContainerWindow()
    if window is None or not window.isVisible():
        print("thrustbook: " + text, file=sys.stderr)
        return
    kind = uno.Enum("com.sun.star.awt.MessageBoxType", "INFOBOX")
    window.getToolkit().createMessageBox(window, kind, 1, "thrustbook", text).execute()


g_ImplementationHelper = unohelper.ImplementationHelper()
for _service in (Functions, Relink, Batch):
    g_ImplementationHelper.addImplementation(_service, _service.NAME, _service.SERVICES)
