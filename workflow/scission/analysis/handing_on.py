"""An analysis on disk, so that the steps after it need no second one: its tables, and a small file beside them."""

from __future__ import annotations

import json
from pathlib import Path

from scission.analysis.campaign import Analysis
from scission.campaign import Campaign
from scission.records.atomic import write_whole
from scission.tables import read_tables, write_tables

FACTS = "tables/analysis.json"


def hand_on(analysis: Analysis, folder: Path) -> None:
    """Write ``tables/``, ``failures.csv`` and what the tables do not hold below a campaign's folder.

    Raises:
        OSError: the folder cannot be written.
    """
    write_tables(analysis.frames, folder)
    facts = {name: getattr(analysis, name) for name in ("coordinates", "provenance", "mixed")}
    write_whole(folder / FACTS, json.dumps(facts, indent=1).encode())


def take_over(campaign: Campaign, folder: Path) -> Analysis:
    """Return the analysis that was handed on below a campaign's folder.

    Raises:
        FileNotFoundError: there is none yet.
        OSError: a table cannot be read.
    """
    try:
        facts = json.loads((folder / FACTS).read_text(encoding="utf-8"))
    except FileNotFoundError:
        raise FileNotFoundError(f"{folder / FACTS} is missing: run scripts/analyse.py first") from None
    return Analysis(campaign, read_tables(folder), **facts)
