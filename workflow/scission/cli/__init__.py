"""The console command ``scission``: one module per subcommand, listed in ``COMMANDS``.

Contract for a new subcommand: a module with ``SUMMARY`` (one line), ``EXAMPLE`` (a command line),
``add_arguments(parser)`` and ``main(args, rest) -> int``, where ``rest`` holds options it does not know;
only ``run`` and ``retry`` pass those on, the others refuse them.  Modules import what they need inside
their functions, so that every ``--help`` comes at once.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from types import ModuleType

from scission.cli import check, retry, run, status, tables

COMMANDS: dict[str, ModuleType] = {
    "run": run,
    "check": check,
    "status": status,
    "retry": retry,
    "tables": tables,
}


def build_parser() -> argparse.ArgumentParser:
    """Return the parser of the whole command."""
    parser = argparse.ArgumentParser(
        prog="scission",
        description="Bond scans by quantum chemistry: from one campaign file to curves, flags and tables.",
        epilog="example: scission run config/demo.yaml",
        allow_abbrev=False,
    )
    commands = parser.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for name, module in COMMANDS.items():
        sub = commands.add_parser(
            name,
            help=module.SUMMARY,
            description=module.__doc__,
            epilog=f"example:\n  {module.EXAMPLE}",
            formatter_class=argparse.RawDescriptionHelpFormatter,
            allow_abbrev=False,
        )
        module.add_arguments(sub)
        sub.set_defaults(parser=sub)
    return parser


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command line; return the exit status."""
    args, rest = build_parser().parse_known_args(arguments)
    module = COMMANDS[args.command]
    if rest and not getattr(module, "PASSES_ON", False):
        args.parser.error(f"unknown: {' '.join(rest)}")
    try:
        return int(module.main(args, rest))
    except KeyboardInterrupt:
        return 130
    except BrokenPipeError:  # the reader of a pipe has had enough
        sys.stderr.close()
        return 1
