"""The extension as a file: types, registration, wizard texts, and what its code may use."""

from __future__ import annotations

import ast
import io
import json
import subprocess
import sys
import zipfile
from pathlib import Path
from xml.etree import ElementTree

import pytest

from thrustbook.addin.catalogue.registry import CATALOGUE
from thrustbook.addin.hosts.calc import describe, extension, slots, typelib
from thrustbook.addin.hosts.calc.slots import Slot

WRITER = Path("/usr/lib/libreoffice/sdk/bin/unoidl-write")
OFFICE_TYPES = Path("/usr/lib/libreoffice/program/types.rdb")
FILES = extension.parts("/opt/python/bin/python3")
CODE = [name for name in FILES if name.endswith(".py")]
OOR = "{http://openoffice.org/2001/registry}"


def test_compiled_types_are_what_the_offices_own_compiler_writes(tmp_path: Path) -> None:
    """Byte for byte, but for the banner that names the program that wrote them."""
    if not WRITER.exists():
        pytest.fail("unoidl-write is missing (on Debian and Ubuntu: apt install libreoffice-dev)")
    source, target = tmp_path / "types.idl", tmp_path / "types.rdb"
    source.write_bytes(FILES["types/XFunctions.idl"])
    subprocess.run([WRITER, OFFICE_TYPES, source, target], check=True, timeout=60)
    theirs = target.read_bytes()
    banner = theirs[16 : theirs.index(b" **\0") + 4]
    methods = [f.method for f in describe.functions()]
    assert typelib.compiled(describe.INTERFACE, methods, banner) == theirs


def test_types_are_current_with_the_catalogue() -> None:
    text = FILES["types/XFunctions.idl"].decode()
    compiled = FILES["types/thrustbook.rdb"]
    for name in CATALOGUE:
        assert f" {name}(" in text
        assert name.encode() in compiled


def test_the_same_catalogue_gives_the_same_file() -> None:
    assert extension.archive(FILES) == extension.archive(extension.parts("/opt/python/bin/python3"))


def test_one_command_builds_the_file(tmp_path: Path) -> None:
    target = tmp_path / "thrustbook.oxt"
    command = [sys.executable, "-m", "thrustbook.addin.hosts.calc.extension", str(target)]
    done = subprocess.run(command, capture_output=True, text=True, check=True, timeout=60)
    assert f"{len(CATALOGUE)} functions" in done.stdout
    with zipfile.ZipFile(io.BytesIO(target.read_bytes())) as archive:
        assert set(archive.namelist()) == set(FILES)
        settings = json.loads(archive.read("pythonpath/thrustbook_office/settings.json"))
    assert settings["python"] == sys.executable
    assert [entry[0] for entry in settings["functions"]] == list(CATALOGUE)


def test_every_registered_file_is_there() -> None:
    space = "{http://openoffice.org/2001/manifest}"
    root = ElementTree.fromstring(FILES["META-INF/manifest.xml"])
    entries = {node.get(f"{space}full-path") for node in root.iter(f"{space}file-entry")}
    assert entries <= set(FILES)
    for name, data in FILES.items():
        if name.endswith((".xml", ".xcu", ".components")):
            ElementTree.fromstring(data)


def test_wizard_texts_are_complete() -> None:
    root = ElementTree.fromstring(FILES["CalcAddIns.xcu"])
    functions = root.find(f".//node[@{OOR}name='AddInFunctions']")
    assert functions is not None
    names = [node.get(f"{OOR}name") for node in functions]
    assert names == list(CATALOGUE)
    for node, row in zip(functions, CATALOGUE.values(), strict=True):
        texts = {
            str(prop.get(f"{OOR}name")): "".join(prop.itertext()).strip() for prop in node.findall("prop")
        }
        assert texts["DisplayName"] == texts["CompatibilityName"] == row.name
        assert texts["Description"] == row.summary
        places = ["".join(p.itertext()).strip() for p in node.findall(f".//prop[@{OOR}name='DisplayName']")]
        assert places[1:] == [place.name for place in describe.described(row).places]
        assert all(place.text.strip() for place in describe.described(row).places)


def test_parameters_sort_in_their_order() -> None:
    """The office's configuration keeps a set by name."""
    for function in describe.functions():
        assert sorted(function.method.parameters) == list(function.method.parameters)


@pytest.mark.parametrize("name", CODE)
def test_code_in_the_office_needs_nothing_but_python_3_8(name: str) -> None:
    tree = ast.parse(FILES[name], feature_version=(3, 8))
    allowed = {*sys.stdlib_module_names, "uno", "unohelper", "com", "org", "thrustbook_office"}
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            roots = {alias.name.split(".")[0] for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and not node.level:
            roots = {str(node.module).split(".")[0]}
        else:
            continue
        assert roots <= allowed
    # Annotations such as list[int] are no Python of 3.8 unless they are never evaluated.
    assert b"from __future__ import annotations" in FILES[name] or b"def " not in FILES[name]


def test_functions_that_give_one_text_do_so() -> None:
    from thrustbook.addin import dispatch
    from thrustbook.addin.formula_text import read_call

    for name in describe.SINGLE:
        assert isinstance(dispatch.call(*read_call(CATALOGUE[name].example)), str)


def test_zero_is_empty_only_where_no_number_can_be_meant() -> None:
    for row in CATALOGUE.values():
        found = slots.slots(row)
        assert len(found) == row.leading + len(row.args)
        for arg, slot in zip(row.args, found[row.leading :], strict=True):
            bound = row.bound(arg)
            if slot is Slot.ZERO_IS_EMPTY and bound is not None and not arg.choices:
                assert not row.required(arg)
                assert not bound.allows(0.0)


def test_wizard_warns_where_an_empty_cell_would_count_as_zero() -> None:
    warned = 0
    for row in CATALOGUE.values():
        places = {place.name: place.text for place in describe.described(row).places}
        for name in slots.zero_for_empty(row):
            warned += 1
            assert "An empty cell counts as 0 here" in places[name]
    assert warned
