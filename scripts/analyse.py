#!/usr/bin/env python3
"""Judge and fit all points of a campaign; write its tables and the list of failures.

The engine calls it; by hand:
    .venv/bin/python scripts/analyse.py --results results/demo --campaign config/demo.yaml
"""

import argparse
from pathlib import Path

from scission.execution.closing import tabulate_campaign


def main() -> None:
    """Read the arguments and analyse."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False
    )
    parser.add_argument("--results", type=Path, required=True, help="folder of the campaign's results")
    parser.add_argument("--campaign", type=Path, required=True, help="campaign file")
    args = parser.parse_args()
    tabulate_campaign(args.campaign, args.results.absolute())


if __name__ == "__main__":
    main()
