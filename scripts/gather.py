#!/usr/bin/env python3
"""Bring all records of a campaign together in campaign.h5.

The engine calls it; by hand:
    .venv/bin/python scripts/gather.py --results results/demo --campaign config/demo.yaml
"""

from scission.execution.closing import gather_campaign, run_step

if __name__ == "__main__":
    run_step(__doc__, gather_campaign)
