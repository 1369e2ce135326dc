"""The arrows of the house run one way."""

from __future__ import annotations

import ast
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
HOST_LIBRARIES = {
    "xlwings": "excel",
    "uno": "calc",
    "unohelper": "calc",
    "com": "calc",
    "formualizer": "headless",
}


def imports(path: Path) -> set[str]:
    """List the modules that a file imports, relative ones resolved against the house."""
    found = set()
    package = ["thrustbook", *path.relative_to(ROOT).parent.parts]
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            base = ".".join(package[: len(package) - node.level + 1]) + "." if node.level else ""
            found.add((base + (node.module or "")).rstrip("."))
            found |= {(base + (node.module or "")).rstrip(".") + "." + alias.name for alias in node.names}
    return found


@pytest.mark.parametrize("path", sorted((ROOT / "engine").rglob("*.py")), ids=lambda p: p.name)
def test_the_engine_knows_numbers_only(path: Path) -> None:
    for name in imports(path):
        top = name.split(".")[0]
        assert top not in {"pint", "openpyxl", "lxml", *HOST_LIBRARIES}, name
        assert not name.startswith(("thrustbook.addin", "thrustbook.workbooks")), name


@pytest.mark.parametrize(
    "path", sorted((ROOT / "addin").rglob("*.py")), ids=lambda p: str(p.relative_to(ROOT / "addin"))
)
def test_host_libraries_stay_in_their_host_folder(path: Path) -> None:
    inside = path.relative_to(ROOT / "addin").parts
    host = inside[1] if inside[0] == "hosts" and len(inside) > 2 else ""
    for name in imports(path):
        library = name.split(".")[0]
        if library in HOST_LIBRARIES and path.name != "doctor.py":  # the doctor looks whether they are there
            assert host == HOST_LIBRARIES[library], f"{name} in {path}"
        if not host and "commands" not in inside and not inside[0].startswith("reference"):
            assert not name.startswith("thrustbook.addin.commands"), name


def test_no_sham_vectorisation() -> None:
    for path in [*(ROOT / "engine").rglob("*.py"), *(ROOT / "addin").rglob("*.py")]:
        assert "np.vectorize" not in path.read_text(encoding="utf-8"), path


def test_every_package_is_listed_for_the_wheel() -> None:
    settings = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["tool"]["setuptools"]
    found = {
        ".".join(["thrustbook", *path.parent.relative_to(ROOT).parts])
        for top in ("engine", "addin", "workbooks")
        for path in (ROOT / top).rglob("__init__.py")
    }
    assert found == set(settings["packages"])


def test_files_stay_short() -> None:
    for top in ("engine", "addin", "workbooks"):
        for path in (ROOT / top).rglob("*.py"):
            lines = len(path.read_text(encoding="utf-8").splitlines())
            assert lines <= 430, f"{path.relative_to(ROOT)} has {lines} lines"
