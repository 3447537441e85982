"""Hand the tables of campaigns on: CSV, Parquet and an open data package with types, units and meanings.

Several campaigns become one set of tables with a first column that names the campaign.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path

from scission.cli.common import WRONG_INPUT, WrongInputError, find_layout, results_folder, tell

SUMMARY = "write the tables of campaigns to a folder that describes itself"
EXAMPLE = "scission tables config/demo.yaml --to demo-tables"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("campaigns", nargs="+", help="campaign file, its name, or its results folder")
    parser.add_argument("--to", type=Path, required=True, metavar="FOLDER", help="where the tables go")
    parser.add_argument(
        "--results", type=Path, metavar="FOLDER", help="where results are (default: results/)"
    )
    parser.add_argument("--geometries", action="store_true", help="all geometries as extended XYZ, too")


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:  # noqa: ARG001
    """Write the tables; return 0, or 2 when a campaign is not there or the folder cannot be written."""
    from scission.handover import concat, open_campaign, write_package

    try:
        folders = [find_layout(name, results_folder(args.results)).folder for name in args.campaigns]
        opened = [open_campaign(folder) for folder in folders]
        source = opened[0] if len(opened) == 1 else concat(opened)
        written = write_package(source, args.to, args.geometries)
    except (WrongInputError, OSError, ValueError) as error:
        tell(str(error))
        return WRONG_INPUT
    print(f"{len(written)} files in {args.to}; {written[-1].name} says what is in them")
    return 0
