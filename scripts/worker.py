#!/usr/bin/env python3
"""Do one job of a plan: compute its points that are missing or requested.

The engine calls it; by hand it repeats a job:
    .venv/bin/python scripts/worker.py --results results/demo --job correlate.h2.cc.0123456789
"""

import argparse
import sys
from pathlib import Path

from scission.execution.storage import told_plainly
from scission.execution.worker import Limits, run_job


def main() -> int:
    """Read the arguments and run the job."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False
    )
    parser.add_argument("--results", type=Path, required=True, help="folder of the campaign's results")
    parser.add_argument("--job", required=True, help="name of the job, as in plan/plan.json")
    parser.add_argument("--attempt", type=int, default=1, help="the engine's attempt at this job, from 1")
    parser.add_argument("--attempts", type=int, default=1, help="how many attempts the engine makes at most")
    parser.add_argument("--mem-mb", type=float, default=4000.0, help="memory granted to the job, MB")
    parser.add_argument(
        "--runtime-min", type=float, default=1440.0, help="run time granted to the job, minutes"
    )
    args = parser.parse_args()
    limits = Limits(args.mem_mb, args.runtime_min)
    last = args.attempt >= args.attempts
    return told_plainly(lambda: run_job(args.results.absolute(), args.job, args.attempt, last, limits))


if __name__ == "__main__":
    sys.exit(main())
