"""``thrustbook new``: a calculation workbook from a template."""

from __future__ import annotations

import argparse
import shutil
import sys
from pathlib import Path

from thrustbook.workbooks.templates import TEMPLATES, shipped


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    parser.add_argument(
        "template", nargs="?", choices=list(TEMPLATES), help="without it, the templates are listed"
    )
    parser.add_argument(
        "file", nargs="?", type=Path, help="the workbook to write; an existing file is never replaced"
    )


def run(options: argparse.Namespace) -> int:
    """Copy a template, or list them."""
    if options.template is None:
        width = max(map(len, TEMPLATES))
        print("\n".join(f"  {name:<{width}}  {text}" for name, text in TEMPLATES.items()))
        return 0
    target: Path = options.file or Path(f"{options.template}.xlsx")
    if target.suffix.lower() != ".xlsx":
        print(f"{target}: the name must end in .xlsx", file=sys.stderr)
        return 2
    try:
        # Opened exclusively, so that a file made in the meantime is not replaced either.
        with target.open("xb") as out, shipped(options.template).open("rb") as source:
            shutil.copyfileobj(source, out)
    except FileExistsError:
        print(f"{target}: there is a file of this name; choose another", file=sys.stderr)
        return 2
    except OSError as error:
        print(f"{target}: {error.strerror or error}", file=sys.stderr)
        return 2
    print(f"wrote {target}; scenario and figures in it are invented")
    print(f"next: change its inputs, then run: thrustbook evaluate {target}")
    return 0
