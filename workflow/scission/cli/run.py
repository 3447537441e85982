"""Run a campaign: compute what is missing, then gather, analyse and report.

The campaign file comes first; without one the demo is run.  Options that are not listed below go to
the workflow engine (--cores 4, --dry-run ...).  Running again computes only what is missing.
Exit status: 0 all points are good; 3 finished, and failures.csv lists points; 2 the campaign file is
wrong, nothing was started; anything else is a fault of the program.
"""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from scission.cli.common import DEMO, WRONG_INPUT, WrongInputError, read_campaign, results_folder, tell
from scission.cli.disk import watch_disk
from scission.cli.limits import add_limits, within_core_hours, within_points

if TYPE_CHECKING:
    from scission.campaign import Campaign

SUMMARY = "run a campaign, or go on with one"
EXAMPLE = "scission run config/demo.yaml --cores 2"
PASSES_ON = True


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options; the campaign itself is taken from what argparse leaves over."""
    parser.usage = "scission run [CAMPAIGN.yaml] [options] [options of the workflow engine]"
    add_run_options(parser)
    add_limits(parser)


def add_run_options(parser: argparse.ArgumentParser) -> None:
    """Declare what every command that runs a campaign understands."""
    parser.add_argument("--results", type=Path, metavar="FOLDER", help="where results go (default: results/)")
    parser.add_argument(
        "--on", default="local", metavar="PROFILE", help="local, slurm, or the folder of another profile"
    )
    parser.add_argument(
        "--orphans",
        choices=("wait", "cancel", "none"),
        default="wait",
        help="jobs that an earlier, killed run left running in Slurm: wait for them (default), cancel them, "
        "or none: do not look for any; jobs that have not started are cancelled in any case, and submitted "
        "again",
    )
    parser.add_argument("--verbose", action="store_true", help="show everything the workflow engine says")


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:
    """Run the campaign; return the exit status."""
    from scission.cli.campaign_run import run_campaign

    try:
        path, extra = split_campaign(rest)
        campaign, results = read_campaign(path), results_folder(args.results)
        _within_limits(campaign, results, args)
        folder = results / campaign.name
        check = partial(_recheck, folder)
        run = partial(run_campaign, path.absolute(), campaign.name, results, args, extra, prepare=check)
        return watch_disk(folder, run)
    except WrongInputError as error:
        tell(str(error))
        return WRONG_INPUT


def _recheck(folder: Path) -> None:
    from scission.execution.layout import Layout
    from scission.execution.recheck import recheck

    for words in recheck(Layout(folder)):
        tell(words)


def _within_limits(campaign: Campaign, results: Path, args: argparse.Namespace) -> None:
    """Refuse a campaign that is too large; one that has been started is not forecast again.

    Raises:
        WrongInputError: says which limit, and how to raise it.
    """
    from scission.cli.check import learnt
    from scission.execution.planning import expand
    from scission.forecast import estimate

    within_points(campaign, args)
    if not (results / campaign.name / "plan" / "plan.json").is_file():
        within_core_hours(estimate(expand(campaign, {}), learnt(results)), args)


def split_campaign(rest: Sequence[str]) -> tuple[Path, list[str]]:
    """Return the campaign file and what is left for the engine.

    The campaign is the first word unless that is an option, else a last word that ends in .yaml or
    .yml and follows no option that takes a file.

    Raises:
        WrongInputError: the engine is given a campaign file by its own option.
    """
    words = list(rest)
    if any(word.split("=")[0] in ("--configfile", "--configfiles") for word in words):
        raise WrongInputError("give the campaign file as the first word, not with --configfile")
    if words and not words[0].startswith("-"):
        return Path(words[0]), words[1:]
    named = words[-1:] and words[-1].endswith((".yaml", ".yml"))
    if named and (len(words) == 1 or not words[-2].startswith("--") or "=" in words[-2]):
        return Path(words[-1]), words[:-1]
    return DEMO, words
