"""Show how far a campaign is, while it runs and after; reads only, from file names and summaries."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from pathlib import Path

from scission.cli.common import WRONG_INPUT, WrongInputError, find_layout, results_folder, tell
from scission.cli.table import table

SUMMARY = "show how far a campaign is"
EXAMPLE = "scission status config/demo.yaml"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("campaign", nargs="?", help="campaign file, its name, or its results folder")
    parser.add_argument(
        "--results", type=Path, metavar="FOLDER", help="where results are (default: results/)"
    )


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:  # noqa: ARG001
    """Print the counts by scan and level; return 0, or 2 when there is no such campaign."""
    from scission.execution.progress import Progress

    try:
        progress = Progress.of(find_layout(args.campaign, results_folder(args.results)))
    except WrongInputError as error:
        tell(str(error))
        return WRONG_INPUT
    rows: list[tuple[str, ...]] = [("scan", "level", "points", "good", "not good", "left")]
    for (scan, level), n in progress.by_group().items():
        rows.append((scan, level, str(n.total), str(n.good), str(n.failed), str(n.left)))
    all_points, references = progress.points(), progress.reference_count()
    numbers = (all_points.total, all_points.good, all_points.failed, all_points.left)
    rows.append(("all", "", *(str(n) for n in numbers)))
    print(table(rows))
    print(f"references: {references.done} of {references.total} done, {references.failed} not good")
    running = progress.running()
    print(f"at work: {', '.join(running) if running else 'nothing'}")
    return 0
