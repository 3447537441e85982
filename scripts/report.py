#!/usr/bin/env python3
"""Draw all scans of a campaign and write the page to look at.

The engine calls it; by hand:
    .venv/bin/python scripts/report.py --results results/demo --campaign config/demo.yaml
"""

from scission.execution.closing import run_step, show_campaign

if __name__ == "__main__":
    run_step(__doc__, show_campaign)
