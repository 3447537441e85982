"""Check a campaign file without starting anything: all problems at once, or what it asks for."""

from __future__ import annotations

import argparse
from collections import Counter
from collections.abc import Sequence
from pathlib import Path

from scission.cli.common import DEMO, WRONG_INPUT, WrongInputError, read_campaign, tell

SUMMARY = "check a campaign file and count its points and jobs"
EXAMPLE = "scission check config/demo.yaml"


def add_arguments(parser: argparse.ArgumentParser) -> None:
    """Declare the options."""
    parser.add_argument(
        "campaign", type=Path, nargs="?", default=DEMO, help="campaign file (default: the demo)"
    )
    parser.add_argument("--block-seconds", type=float, help="forecast work in one job, s (see the profiles)")


def main(args: argparse.Namespace, rest: Sequence[str]) -> int:  # noqa: ARG001
    """Check the file; return 0, or 2 after showing every problem."""
    from scission.execution.planning import expand, plan_options

    try:
        campaign = read_campaign(args.campaign)
        given = {} if args.block_seconds is None else {"block_seconds": args.block_seconds}
        plan = expand(campaign, plan_options(given))
    except (WrongInputError, ValueError) as error:
        tell(str(error))
        return WRONG_INPUT
    print(f"{args.campaign}: campaign {campaign.name!r} is well formed")
    for (scan, level), n in Counter((p.scan, p.level) for p in plan.points).items():
        print(f"  {scan}  {level}  {n} points")
    stages = Counter(job.stage for job in plan.jobs)
    keys = len({p.key for p in plan.points})
    print(f"{len(plan.points)} points ({keys} different calculations), {len(plan.jobs)} jobs: ", end="")
    print(", ".join(f"{n} {stage}" for stage, n in stages.items()))
    return 0
