"""Show how far a campaign is, while it runs and after; from any shell, on a laptop or a login node.

Reads names of records and the small files of jobs only; opens no record, locks nothing, writes nothing.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from scission.cli.common import WRONG_INPUT, WrongInputError, find_layout, results_folder, tell
from scission.cli.table import table

if TYPE_CHECKING:
    from scission.cli.snapshot import Count, Snapshot
    from scission.execution.layout import Layout

SUMMARY = "show how far a campaign is"
EXAMPLE = "scission status config/demo.yaml --watch"
_MOST_ROWS = 60
_LISTED = 5


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("campaign", nargs="?", help="campaign file, its name, or its results folder")
    parser.add_argument(
        "--results", type=Path, metavar="FOLDER", help="where results are (default: results/)"
    )
    parser.add_argument(
        "--watch",
        type=float,
        nargs="?",
        const=5.0,
        metavar="SECONDS",
        help="show it again and again until all is done (default: every 5 s)",
    )
    parser.add_argument("--all", action="store_true", help="a row for every scan, however many there are")


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:  # noqa: ARG001
    """Print the counts by scan and level; return 0, or 2 when there is no such campaign."""
    from scission.cli.snapshot import Watcher

    try:
        layout = find_layout(args.campaign, results_folder(args.results))
    except WrongInputError as error:
        tell(str(error))
        return WRONG_INPUT
    watcher = Watcher(layout)
    while True:
        snapshot = watcher.look()
        text = status_text(snapshot, layout, args.all)
        print(f"\033[H\033[J{text}" if args.watch and sys.stdout.isatty() else text, flush=True)
        over = not snapshot.jobs and not snapshot.total.left
        if args.watch is None or over:
            return 0
        time.sleep(max(0.2, args.watch))


def status_text(snapshot: Snapshot, layout: Layout, every_scan: bool = False) -> str:
    """Return all that is shown of one moment."""
    references = snapshot.references
    lines = [
        table(_rows(snapshot, every_scan)),
        f"references: {references.good} of {references.total} good, {references.failed} not good, "
        f"{references.left} left, {references.running} running",
        f"at work: {', '.join(snapshot.jobs[:_LISTED]) or 'nothing'}"
        + (f" and {len(snapshot.jobs) - _LISTED} more" if len(snapshot.jobs) > _LISTED else ""),
    ]
    return "\n".join([*lines, *_pace_lines(snapshot), *_slowest_lines(snapshot, layout)])


def _rows(snapshot: Snapshot, every_scan: bool) -> list[tuple[str, ...]]:
    groups = snapshot.groups if every_scan or len(snapshot.groups) <= _MOST_ROWS else _by_level(snapshot)
    rows: list[tuple[str, ...]] = [("scan", "level", "points", "good", "not good", "left", "running")]
    rows += [(scan, level, *_numbers(count)) for (scan, level), count in groups.items()]
    return [*rows, ("all", "", *_numbers(snapshot.total))]


def _by_level(snapshot: Snapshot) -> dict[tuple[str, str], Count]:
    from scission.cli.snapshot import Count

    scans = len({scan for scan, _ in snapshot.groups})
    summed: dict[tuple[str, str], Count] = {}
    for (_, level), count in snapshot.groups.items():
        summed.setdefault((f"({scans} scans)", level), Count()).add(count)
    return summed


def _numbers(count: Count) -> tuple[str, ...]:
    return tuple(str(n) for n in (count.total, count.good, count.failed, count.left, count.running))


def _pace_lines(snapshot: Snapshot) -> list[str]:
    from scission.execution.progress import duration

    if not snapshot.jobs:
        return []
    left = snapshot.seconds_left
    words = f"about {duration(left)} left" if left is not None else "time left: cannot be told yet"
    return [f"throughput: {60 * snapshot.per_second:.3g} points and references a minute lately; {words}"]


def _slowest_lines(snapshot: Snapshot, layout: Layout) -> list[str]:
    from scission.cli.snapshot import slowest
    from scission.execution.progress import duration

    at_work = [f"{item.what} ({duration(item.seconds)})" for item in snapshot.at_work[:_LISTED]]
    finished = [(item.what, item.seconds) for item in snapshot.slowest]
    if not finished:  # summaries of an earlier version do not tell
        finished = slowest(layout.folder / "tables" / "points.csv", _LISTED)
    took = [f"{what} ({duration(seconds)})" for what, seconds in finished[:_LISTED]]
    lines = [("longest at work", at_work), ("slowest points", took)]
    return [f"{name}: {'; '.join(items)}" for name, items in lines if items]
