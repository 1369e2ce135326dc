"""The command line. A command's module is imported only when that command runs, to keep the start quick."""

from __future__ import annotations

import argparse
import importlib
import os
import sys
from collections.abc import Sequence

COMMANDS = {
    "evaluate": "evaluate every formula of a workbook and store the values",
    "check": "find what a checker should look at: stale values, odd formulas, units, physics",
    "longhand": "make a copy with the long-hand working of every cell",
    "detach": "make a copy that recalculates with no add-in",
    "new": "make a calculation workbook from a template",
    "functions": "list the worksheet functions, or describe one",
    "install": "put the functions into a spreadsheet program: calc or excel",
    "uninstall": "take the functions out of a spreadsheet program: calc or excel",
    "doctor": "tell what is installed and which hosts are available",
}
"""Command -> what it does; the module of the same name in addin/commands runs it."""

EXIT_OK, EXIT_REFUSED = 0, 2


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line; gives 0 for success, 1 for failed cells or findings, 2 for a refusal.

    ``check`` gives 3 where a finding is an error.
    """
    given = list(sys.argv[1:] if arguments is None else arguments)
    parser = argparse.ArgumentParser(
        prog="thrustbook",
        description="Forces of flowing fluid on pipework, as functions in calculation workbooks.",
        epilog="Results are hydraulic forces from a stated idealisation; "
        "local codes and licensed practice govern.",
    )
    parser.add_argument("--version", action="store_true", help="print the version and stop")
    commands = parser.add_subparsers(dest="command", metavar="COMMAND")
    wanted = next((a for a in given if not a.startswith("-")), None)
    for name, summary in COMMANDS.items():
        sub = commands.add_parser(name, help=summary, description=summary[0].upper() + summary[1:] + ".")
        if name == wanted:
            module = importlib.import_module(f".commands.{name}", __package__)
            module.configure(sub)
            sub.set_defaults(run=module.run)
    options = parser.parse_args(given)
    if options.version:
        from .tools import version

        print(version([]))
        return EXIT_OK
    if options.command is None:
        parser.print_help()
        return EXIT_REFUSED
    try:
        return int(options.run(options))
    except BrokenPipeError:
        # The reader of our output has gone; python must not complain when it flushes.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return EXIT_OK
    except KeyboardInterrupt:
        print("stopped; no file was changed", file=sys.stderr)
        return EXIT_REFUSED


if __name__ == "__main__":
    sys.exit(main())
