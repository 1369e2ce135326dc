"""Builds the extension ``thrustbook.oxt`` from the catalogue.

Run as ``python -m thrustbook.addin.hosts.calc.extension FILE`` it writes the file;
``thrustbook install calc`` builds and registers it. No SDK is needed.
"""

from __future__ import annotations

import argparse
import io
import json
import sys
import zipfile
from collections.abc import Sequence
from importlib import resources
from pathlib import Path
from xml.sax.saxutils import escape, quoteattr

from ...tools import product_version
from .describe import CATEGORY, INTERFACE, Described, functions
from .office.settings import BATCH, FUNCTIONS, PREFIX, RELINK
from .typelib import compiled, idl

IDENTIFIER = PREFIX
_HEAD = '<?xml version="1.0" encoding="UTF-8"?>\n'
_OOR = (
    'xmlns:oor="http://openoffice.org/2001/registry" xmlns:xs="http://www.w3.org/2001/XMLSchema" '
    'xmlns:xsi="http://www.w3.org/2001/XMLSchema-instance"'
)


def parts(python: str | None = None, described: Sequence[Described] | None = None) -> dict[str, bytes]:
    """Give the files of the extension by name.

    Parameters
    ----------
    python : str, optional
        Interpreter in which thrustbook is installed; the running one when left out.
    """
    every = list(functions() if described is None else described)
    methods = [f.method for f in every]
    settings = {
        "python": python or sys.executable,
        "version": product_version(),
        "functions": [[f.name, f.repeats, f.single] for f in every],
    }
    texts = {
        "META-INF/manifest.xml": _manifest(),
        "description.xml": _description(product_version()),
        "thrustbook.components": _components(),
        "CalcAddIns.xcu": _calc_addins(every),
        "Addons.xcu": _addons(),
        "types/XFunctions.idl": idl(INTERFACE, methods),
        "pythonpath/thrustbook_office/settings.json": json.dumps(settings, indent=1),
    }
    out = {name: text.encode() for name, text in texts.items()}
    out["types/thrustbook.rdb"] = compiled(INTERFACE, methods)
    for source in resources.files(f"{__package__}.office").iterdir():
        if source.name.endswith(".py"):
            folder = "" if source.name == "component.py" else "pythonpath/thrustbook_office/"
            out[folder + source.name] = source.read_bytes()
    return dict(sorted(out.items()))


def archive(files: dict[str, bytes]) -> bytes:
    """Pack the files; the same files always give the same bytes."""
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as target:
        for name, data in files.items():
            target.writestr(zipfile.ZipInfo(name, (1980, 1, 1, 0, 0, 0)), data, zipfile.ZIP_DEFLATED)
    return packed.getvalue()


def unpack_to(folder: Path, files: dict[str, bytes]) -> None:
    """Write the files as they lie in an office that has the extension bundled."""
    for name, data in files.items():
        path = folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(data)


def _manifest() -> str:
    kinds = {
        "types/thrustbook.rdb": "application/vnd.sun.star.uno-typelibrary;type=RDB",
        "thrustbook.components": "application/vnd.sun.star.uno-components",
        "CalcAddIns.xcu": "application/vnd.sun.star.configuration-data",
        "Addons.xcu": "application/vnd.sun.star.configuration-data",
    }
    entries = "".join(
        f'  <manifest:file-entry manifest:full-path="{path}" manifest:media-type="{kind}"/>\n'
        for path, kind in kinds.items()
    )
    space = "http://openoffice.org/2001/manifest"
    return f'{_HEAD}<manifest:manifest xmlns:manifest="{space}">\n{entries}</manifest:manifest>\n'


def _description(version: str) -> str:
    return f"""{_HEAD}<description xmlns="http://openoffice.org/extensions/description/2006"
    xmlns:d="http://openoffice.org/extensions/description/2006" xmlns:xlink="http://www.w3.org/1999/xlink">
  <identifier value="{IDENTIFIER}"/>
  <version value="{version}"/>
  <display-name><name lang="en">thrustbook</name></display-name>
  <dependencies>
    <OpenOffice.org-minimal-version value="4.0" d:name="LibreOffice 4.0"/>
  </dependencies>
</description>
"""


def _components() -> str:
    services = {
        FUNCTIONS: (FUNCTIONS, "com.sun.star.sheet.AddIn"),
        RELINK: (RELINK,),
        BATCH: (BATCH,),
    }
    lines = [
        f'{_HEAD}<components xmlns="http://openoffice.org/2010/uno-components">',
        '  <component loader="com.sun.star.loader.Python" uri="component.py">',
    ]
    for implementation, names in services.items():
        lines.append(f'    <implementation name="{implementation}">')
        lines += [f'      <service name="{name}"/>' for name in names]
        lines.append("    </implementation>")
    return "\n".join([*lines, "  </component>", "</components>", ""])


def _value(name: str, text: str, kind: str = "") -> str:
    """Write a property with a text in English, which every other language falls back to."""
    typed = f' oor:type="{kind}"' if kind else ""
    return f'<prop oor:name="{name}"{typed}><value xml:lang="en-US">{escape(text)}</value></prop>'


def _plain(name: str, text: str, kind: str = "xs:string") -> str:
    return f'<prop oor:name="{name}" oor:type="{kind}"><value>{escape(text)}</value></prop>'


def _node(name: str, *content: str) -> str:
    inside = "".join("\n  " + line for part in content for line in part.split("\n"))
    return f'<node oor:name={quoteattr(name)} oor:op="replace">{inside}\n</node>'


def _set(name: str, *content: str) -> str:
    inside = "".join("\n  " + line for part in content for line in part.split("\n"))
    return f'<node oor:name="{name}">{inside}\n</node>'


def _document(name: str, package: str, *content: str) -> str:
    inside = "\n".join(content)
    return (
        f'{_HEAD}<oor:component-data {_OOR} oor:name="{name}" oor:package="{package}">\n'
        f"{inside}\n</oor:component-data>\n"
    )


def _calc_addins(every: Sequence[Described]) -> str:
    nodes = []
    for f in every:
        places = [
            _node(parameter, _value("DisplayName", place.name), _value("Description", place.text))
            for parameter, place in zip(f.method.parameters, f.places, strict=True)
        ]
        nodes.append(
            _node(
                f.name,
                _value("DisplayName", f.name),
                _value("Description", f.text),
                f'<prop oor:name="Category"><value>{CATEGORY}</value></prop>',
                _value("CompatibilityName", f.name),
                _set("Parameters", *places),
            )
        )
    functions_node = _node(FUNCTIONS, _set("AddInFunctions", *nodes))
    return _document("CalcAddIns", "org.openoffice.Office", _set("AddInInfo", functions_node))


def _addons() -> str:
    entry = _node(
        "relink",
        _plain("URL", f"service:{RELINK}?"),
        _value("Title", "Link formulas and recalculate", "xs:string"),
        _plain("Target", "_self"),
        _plain("Context", "com.sun.star.sheet.SpreadsheetDocument"),
    )
    menu = _node(
        f"{PREFIX}.menu",
        _value("Title", "thrustbook", "xs:string"),
        _plain("Context", "com.sun.star.sheet.SpreadsheetDocument"),
        _set("Submenu", entry),
    )
    content = _set("AddonUI", _set("AddonMenu", menu))
    return _document("Addons", "org.openoffice.Office", content)


def main() -> None:
    """Write the extension."""
    parser = argparse.ArgumentParser(description="Build the LibreOffice extension from the catalogue.")
    parser.add_argument("file", type=Path, help="the extension to write, such as thrustbook.oxt")
    parser.add_argument("--python", help="interpreter that has thrustbook; the running one when left out")
    options = parser.parse_args()
    options.file.write_bytes(archive(parts(options.python)))
    print(f"{options.file}: {len(functions())} functions")


if __name__ == "__main__":
    main()
