"""Drives a running office for the tests, in the Python that has the office's uno module.

Commands come as JSON lines, ``["name", argument, ...]``; each is answered by a line:
``{"ok": value}`` or ``{"trouble": text}``. Run as: driver.py PIPE-NAME.
"""

import contextlib
import json
import sys
import time
import traceback

import uno
from com.sun.star.beans import PropertyValue

FILTERS = {"xlsx": "Calc MS Excel 2007 XML", "ods": "calc8", "pdf": "calc_pdf_Export"}


def connect(pipe, patience=60.0):
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
    limit = time.monotonic() + patience
    while True:
        try:
            return resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
        except Exception:
            if time.monotonic() > limit:
                raise
            time.sleep(0.1)


def properties(**given):
    return tuple(PropertyValue(Name=name, Value=value) for name, value in given.items())


class Driver:
    def __init__(self, pipe):
        self.context = connect(pipe)
        make = self.context.ServiceManager.createInstanceWithContext
        self.desktop = make("com.sun.star.frame.Desktop", self.context)
        self.make = make
        self.books = {}
        self.last = 0

    def _keep(self, document):
        if document is None:
            raise RuntimeError("the office could not load the workbook")
        self.last += 1
        self.books[self.last] = document
        return self.last

    def _sheet(self, book, sheet):
        sheets = self.books[book].getSheets()
        return sheets.getByIndex(sheet) if isinstance(sheet, int) else sheets.getByName(sheet)

    def new(self):
        url = "private:factory/scalc"
        return self._keep(self.desktop.loadComponentFromURL(url, "_blank", 0, properties(Hidden=True)))

    def load(self, path, visible=False):
        url = uno.systemPathToFileUrl(path)
        hidden = properties(Hidden=not visible)
        return self._keep(self.desktop.loadComponentFromURL(url, "_blank", 0, hidden))

    def close(self, book):
        self.books.pop(book).close(True)

    def sheets(self, book):
        return list(self.books[book].getSheets().getElementNames())

    def put(self, book, sheet, place, formula):
        """A formula, or a value, into one cell; as an array formula into several."""
        area = self._sheet(book, sheet).getCellRangeByName(place)
        if ":" in place:
            area.setArrayFormula(formula)
        elif isinstance(formula, str):
            area.setFormula(formula)
        else:
            area.setValue(formula)

    def fill(self, book, sheet, place, rows):
        """Values into an area."""
        area = self._sheet(book, sheet).getCellRangeByName(place)
        area.setDataArray(tuple(map(tuple, rows)))

    def formulas(self, book, sheet, place):
        area = self._sheet(book, sheet).getCellRangeByName(place)
        return [list(line) for line in area.getFormulaArray()]

    def enter_again(self, book, sheet, place):
        """Enters the formulas of an area anew, so that unknown names are bound."""
        area = self._sheet(book, sheet).getCellRangeByName(place)
        area.setFormulaArray(area.getFormulaArray())

    def values(self, book, sheet, place):
        """Values of an area; an error as {"error": number}."""
        area = self._sheet(book, sheet).getCellRangeByName(place)
        rows = [list(line) for line in area.getDataArray()]
        for i, line in enumerate(rows):
            for j, value in enumerate(line):
                if value is None:
                    line[j] = {"error": area.getCellByPosition(j, i).getError()}
        return rows

    def shown(self, book, sheet, place):
        area = self._sheet(book, sheet).getCellRangeByName(place)
        size = area.getRangeAddress()
        width, height = size.EndColumn - size.StartColumn + 1, size.EndRow - size.StartRow + 1
        return [[area.getCellByPosition(j, i).getString() for j in range(width)] for i in range(height)]

    def recalculate(self, book):
        """Recalculates everything; gives the seconds that it took."""
        start = time.perf_counter()
        self.books[book].calculateAll()
        return time.perf_counter() - start

    def modified(self, book):
        return self.books[book].isModified()

    def save(self, book, path):
        """Save under a name, as the menu's Save As does."""
        kind = FILTERS[path.rsplit(".", 1)[-1]]
        self.books[book].storeAsURL(uno.systemPathToFileUrl(path), properties(FilterName=kind))

    def save_again(self, book):
        self.books[book].store()

    def copy(self, book, path):
        """Store a copy or an export."""
        kind = FILTERS[path.rsplit(".", 1)[-1]]
        self.books[book].storeToURL(uno.systemPathToFileUrl(path), properties(FilterName=kind))

    def descriptions(self):
        """The texts of the function wizard for every function of ours."""
        every = self.make("com.sun.star.sheet.FunctionDescriptions", self.context)
        found = {}
        for i in range(every.getCount()):
            entry = {p.Name: p.Value for p in every.getByIndex(i)}
            if str(entry["Name"]).startswith("TB_"):
                found[entry["Name"]] = {
                    "category": entry["Category"],
                    "text": entry["Description"],
                    "arguments": [[a.Name, a.Description, a.IsOptional] for a in entry["Arguments"]],
                }
        return found

    def dispatch(self, book, url):
        """Dispatch a command, as a menu does."""
        frame = self.books[book].getCurrentController().getFrame()
        self.desktop.setActiveFrame(frame)
        frame.activate()
        helper = self.make("com.sun.star.frame.DispatchHelper", self.context)
        helper.executeDispatch(frame, url, "", 0, ())

    def protect(self, book, sheet, word):
        self._sheet(book, sheet).protect(word)

    def menu(self):
        """Titles and commands of the add-in's menu, from the office's configuration."""
        provider = self.make("com.sun.star.configuration.ConfigurationProvider", self.context)
        where = properties(nodepath="/org.openoffice.Office.Addons/AddonUI/AddonMenu")
        access = provider.createInstanceWithArguments("com.sun.star.configuration.ConfigurationAccess", where)
        found = []
        for name in access.getElementNames():
            menu = access.getByName(name)
            for entry in menu.Submenu.getElementNames():
                item = menu.Submenu.getByName(entry)
                found.append([menu.Title, item.Title, item.URL])
        return found

    def quit(self):
        for document in self.books.values():
            document.close(True)
        self.books.clear()
        with contextlib.suppress(Exception):  # the bridge goes down with the office
            self.desktop.terminate()


def main():
    driver = Driver(sys.argv[1])
    print(json.dumps({"ok": "ready"}), flush=True)
    for line in sys.stdin:
        name, *arguments = json.loads(line)
        try:
            answer = {"ok": getattr(driver, name)(*arguments)}
        except Exception:
            answer = {"trouble": traceback.format_exc()}
        print(json.dumps(answer), flush=True)
        if name == "quit":
            return


if __name__ == "__main__":
    main()
