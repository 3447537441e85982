"""Compute the points of a failure list again, with its remedies, then gather and report anew.

The list is results/<campaign>/failures.csv, or a copy of it: rows may be deleted, remedies changed.
Only the listed points are computed, and the references they need; a good number is never lost.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from functools import partial
from pathlib import Path

from scission.cli.common import WRONG_INPUT, WrongInputError, find_layout, results_folder, tell
from scission.cli.disk import watch_disk
from scission.cli.run import add_run_options
from scission.execution.layout import Layout, read_json

SUMMARY = "compute the points of a failure list again"
EXAMPLE = "scission retry results/demo/failures.csv"
PASSES_ON = True


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument("failures", type=Path, help="failure list, possibly edited")
    parser.add_argument("--campaign", help="campaign's name or results folder, if the list lies elsewhere")
    parser.add_argument("--remedy", default="", help="use this remedy for all rows (default: each row's own)")
    add_run_options(parser)


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:
    """Request the listed points, then run the campaign; return its exit status."""
    from scission.cli.campaign_run import run_campaign
    from scission.execution.retries import request_points
    from scission.tables import FailureListError, read_failures

    try:
        layout = _layout(args)
        source, settings = made_from(layout)
        rows = read_failures(args.failures)
        request = lambda: tell(request_points(layout, rows, args.remedy))  # noqa: E731
        name, results = layout.folder.name, layout.folder.parent
        run = partial(run_campaign, source, name, results, args, rest, settings, prepare=request)
        return watch_disk(layout.folder, run)
    except (WrongInputError, FailureListError, OSError, ValueError) as error:
        tell(str(error))
        return WRONG_INPUT


def _layout(args: argparse.Namespace) -> Layout:
    if args.campaign:
        return find_layout(args.campaign, results_folder(args.results))
    if not args.failures.is_file():
        raise WrongInputError(f"{args.failures}: there is no such file")
    folder = args.failures.absolute().parent
    if (folder / "plan" / "plan.json").is_file():
        return Layout(folder)
    raise WrongInputError(f"{folder} holds no campaign's results; name the campaign with --campaign")


def made_from(layout: Layout) -> tuple[Path, list[str]]:
    """Return the campaign file and the settings that the plan was made from.

    Raises:
        WrongInputError: the file is no longer there.
    """
    stamp = read_json(layout.plan / "stamp.json") or {}
    source = Path(stamp.get("source", "?"))
    if not source.is_file():
        raise WrongInputError(
            f"the campaign file {source} is no longer there; put it back or run it from its new place"
        )
    return source, [f"{key}={value}" for key, value in stamp.get("options", {}).items()]
