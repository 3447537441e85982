#!/usr/bin/env python3
"""Bring all records of a campaign together in campaign.h5.

The engine calls it; by hand:
    .venv/bin/python scripts/gather.py --results results/demo --campaign config/demo.yaml
"""

import argparse
from pathlib import Path

from scission.execution.closing import gather_campaign


def main() -> None:
    """Read the arguments and gather."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False
    )
    parser.add_argument("--results", type=Path, required=True, help="folder of the campaign's results")
    parser.add_argument("--campaign", type=Path, required=True, help="campaign file")
    args = parser.parse_args()
    gather_campaign(args.campaign, args.results.absolute())


if __name__ == "__main__":
    main()
