#!/usr/bin/env python3
"""Judge and fit all points of a campaign; write its tables and the list of failures.

The engine calls it; by hand:
    .venv/bin/python scripts/analyse.py --results results/demo --campaign config/demo.yaml
"""

from scission.execution.closing import run_step, tabulate_campaign

if __name__ == "__main__":
    run_step(__doc__, tabulate_campaign)
