"""Check a campaign file without starting anything: all its problems at once, or what it will cost.

The forecast is a scaling law for every method, corrected by what the records in results/ took; it gets
better with every campaign that is run there.  A campaign above a limit is refused; the limits can be raised.
"""

from __future__ import annotations

import argparse
import os
from collections import Counter
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

from scission.cli.common import DEMO, WRONG_INPUT, WrongInputError, read_campaign, results_folder, tell
from scission.cli.limits import add_limits, within_core_hours, within_points
from scission.cli.table import table

if TYPE_CHECKING:
    from scission.forecast import Calibration, Forecast, Line
    from scission.plan import Plan

SUMMARY = "check a campaign file and forecast what it will cost"
EXAMPLE = "scission check config/demo.yaml --cores 8"
_GROUPS_SHOWN = 40


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument(
        "campaign", type=Path, nargs="?", default=DEMO, help="campaign file (default: the demo)"
    )
    parser.add_argument(
        "--cores", type=positive, metavar="N", help="cores for the time to finish (default: here)"
    )
    parser.add_argument("--block-seconds", type=float, help="forecast work in one job, s (see the profiles)")
    parser.add_argument(
        "--results", type=Path, metavar="FOLDER", help="whose records to learn from (default: results/)"
    )
    add_limits(parser)


def positive(text: str) -> int:
    """Return a whole number above 0, or raise what argparse shows to a person."""
    if not text.isdecimal() or int(text) < 1:
        raise argparse.ArgumentTypeError(f"{text!r} is not a whole number above 0")
    return int(text)


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:  # noqa: ARG001
    """Check the file and show the forecast; return 0, or 2 for a wrong file or one above a limit."""
    from scission.execution.planning import expand, plan_options
    from scission.forecast import estimate

    try:
        campaign = read_campaign(args.campaign)
        within_points(campaign, args)
        given = {} if args.block_seconds is None else {"block_seconds": args.block_seconds}
        plan = expand(campaign, plan_options(given))
        forecast = estimate(plan, learnt(results_folder(args.results)))
        print(f"{args.campaign}: campaign {campaign.name!r} is well formed")
        print(points_text(plan))
        print(forecast_text(forecast, args.cores or os.cpu_count() or 1), flush=True)
        within_core_hours(forecast, args)
    except (WrongInputError, ValueError) as error:
        tell(str(error))
        return WRONG_INPUT
    return 0


def learnt(results: Path) -> Calibration:
    """Return what finished records teach; where that cannot be kept for the next time, say so."""
    from scission.forecast import Calibration, calibrate

    try:
        return calibrate(results)
    except OSError as error:
        tell(f"what earlier records teach cannot be kept: {error}")
    try:
        return calibrate(results, keep=False)
    except OSError as error:
        tell(f"the forecast goes without earlier records: {error}")
        return Calibration()


def points_text(plan: Plan) -> str:
    """Return the number of points by scan and level, and of jobs by stage."""
    groups = Counter((p.scan, p.level) for p in plan.points)
    lines = [f"  {scan}  {level}  {n} points" for (scan, level), n in groups.items()][:_GROUPS_SHOWN]
    if len(groups) > _GROUPS_SHOWN:
        lines.append(f"  ... and {len(groups) - _GROUPS_SHOWN} more scans and levels")
    stages = Counter(job.stage for job in plan.jobs)
    keys = len({p.key for p in plan.points})
    counted = ", ".join(f"{n} {stage}" for stage, n in stages.items())
    lines.append(
        f"{len(plan.points)} points ({keys} different calculations), {len(plan.jobs)} jobs: {counted}"
    )
    return "\n".join(lines)


def forecast_text(forecast: Forecast, cores: int) -> str:
    """Return the forecast by level, its uncertainty, disk and time to finish."""
    total = forecast.total
    rows: list[tuple[str, ...]] = [
        ("forecast", "calculations", "jobs", "core hours", "from", "to", "MB a job")
    ]
    rows += [_row(line) for line in (*forecast.lines, total)]
    from scission.execution.progress import duration

    seconds = forecast.finish_s(cores)
    share = seconds / total.core_s if total.core_s else 0.0
    low, high = duration(share * total.low_s), duration(share * total.high_s)
    base = f"{forecast.calibrated} earlier records" if forecast.calibrated else "scaling laws alone"
    return "\n".join(
        [
            table(rows, left=1),
            f"disk: about {forecast.disk_mb:.0f} MB",
            f"time to finish with {cores} core(s): about {duration(seconds)} ({low} to {high})",
            f"the forecast rests on {base}; time waiting in a queue is not in it",
        ]
    )


def _row(line: Line) -> tuple[str, ...]:
    hours = (hours_text(s) for s in (line.core_s, line.low_s, line.high_s))
    return (line.name, str(line.calculations), str(line.jobs), *hours, str(line.memory_mb))


def hours_text(seconds: float) -> str:
    """Return hours with two significant digits, without exponents."""
    hours = seconds / 3600
    return (
        f"{hours:.0f}"
        if hours >= 10
        else f"{hours:.1f}"
        if hours >= 1
        else f"{hours:.2g}"
        if hours >= 0.001
        else "<0.001"
    )
