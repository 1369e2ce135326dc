"""``thrustbook install``: put the functions into a spreadsheet program."""

from __future__ import annotations

import argparse
import importlib
from typing import Final

TARGETS: Final = {"calc": "LibreOffice Calc, on any platform", "excel": "Excel on Windows"}


def configure(parser: argparse.ArgumentParser) -> None:
    """Add the command's arguments."""
    words = "; ".join(f"{name}: {text}" for name, text in TARGETS.items())
    parser.add_argument("target", choices=tuple(TARGETS), help=words)


def run(options: argparse.Namespace) -> int:
    """Install; the exit status is the host's own."""
    host = importlib.import_module(f"..hosts.{options.target}.install", __package__)
    return int(host.install(options))
