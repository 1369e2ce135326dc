"""``thrustbook uninstall``: take the functions out of a spreadsheet program."""

from __future__ import annotations

import argparse
import importlib

from .install import configure

__all__ = ["configure", "run"]


def run(options: argparse.Namespace) -> int:
    """Uninstall; the exit status is the host's own."""
    host = importlib.import_module(f"..hosts.{options.target}.install", __package__)
    return int(host.uninstall(options))
