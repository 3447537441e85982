"""The steps after the calculations: tables, gather, report; none of them computes chemistry."""

from __future__ import annotations

import argparse
import sys
from collections import defaultdict
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

from scission.analysis import Analysis, analyse, hand_on, take_over
from scission.analysis.amplitudes import amplitude_steps
from scission.campaign import load_campaign
from scission.diagnostics import DIAGNOSTICS
from scission.execution.layout import Layout, read_json
from scission.execution.recheck import seal, unseal
from scission.execution.remedies import next_remedy
from scission.execution.storage import told_plainly
from scission.plan import Point, make_plan
from scission.records import Store
from scission.records.atomic import write_whole
from scission.records.gather import gather
from scission.report import summary_text, write_report

_TOLD = ("from_angstrom", "to_angstrom", "overlap", "energy_step_hartree", "what")


def run_step(description: str | None, step: Callable[[Path, Path], None]) -> None:
    """Read --campaign and --results from the command line and do one closing step: what its script is made of."""
    parser = argparse.ArgumentParser(
        description=description, formatter_class=argparse.RawDescriptionHelpFormatter, allow_abbrev=False
    )
    parser.add_argument("--results", type=Path, required=True, help="folder of the campaign's results")
    parser.add_argument("--campaign", type=Path, required=True, help="campaign file")
    arguments = parser.parse_args()
    sys.exit(told_plainly(lambda: step(arguments.campaign, arguments.results.absolute())))


def tabulate_campaign(campaign_file: Path, folder: Path) -> None:
    """Write tables/ and failures.csv below ``folder`` (results/<campaign>); tell when records are of different make.

    The other two steps take these tables over: a campaign is analysed once.

    Raises:
        CampaignError: the campaign file has become wrong since the plan was made.
        OSError: a record cannot be read, or a table not be written.
    """
    analysis = _analysed(campaign_file, folder)
    hand_on(analysis, folder)
    for line in analysis.mixed:
        print(f"mixed records: {line}", flush=True)


def gather_campaign(campaign_file: Path, folder: Path) -> None:
    """Write campaign.h5 and its checksum below ``folder``.

    Raises:
        CampaignError: the campaign file has become wrong since the plan was made.
        FileNotFoundError: the tables have not been made.
        OSError: a record cannot be read, or the file not be written.
    """
    campaign = load_campaign(campaign_file, DIAGNOSTICS)
    analysis, out = take_over(campaign, folder), Layout(folder).gathered
    unseal(out)
    points = make_plan(campaign).points
    gather(points, Store(folder), out, analysis.provenance, DIAGNOSTICS, analysis.flags)
    seal(out)


def show_campaign(campaign_file: Path, folder: Path) -> None:
    """Write figures/, report.html and summary.txt, what the terminal shows at the end, below ``folder``.

    Raises:
        CampaignError: the campaign file has become wrong since the plan was made.
        FileNotFoundError: the tables have not been made.
        OSError: a table cannot be read, or a file not be written.
    """
    analysis = take_over(load_campaign(campaign_file, DIAGNOSTICS), folder)
    write_report(analysis, folder)
    write_whole(Layout(folder).summary, summary_text(analysis, folder).encode("utf-8"))


def _analysed(campaign_file: Path, folder: Path) -> Analysis:
    campaign = load_campaign(campaign_file, DIAGNOSTICS)
    points = make_plan(campaign).points
    index = read_json(Layout(folder).plan / "plan.json") or {}
    facts: dict[str, Any] = {name: index[name] for name in ("physics_version", "digest") if name in index}
    jobs = [entry["job"] for entry in index.get("jobs", [])]
    store = Store(folder)
    told = crossings(points, folder, jobs)
    for group, steps in amplitude_steps(points, store).items():
        told[group] = told.get(group, []) + steps
    return analyse(points, campaign, store, facts, next_remedy, told)


def crossings(
    points: Iterable[Point], folder: Path, jobs: Iterable[str]
) -> dict[tuple[str, str], list[dict[str, Any]]]:
    """Return, by scan and level, the places where the jobs found that a reference changes its state."""
    told = [read_json(Layout(folder).job_done(job)) or {} for job in jobs]
    found = [c for summary in told for chain in summary.get("chains", []) for c in chain.get("crossings", [])]
    members: dict[tuple[str, str], set[str]] = defaultdict(set)
    for point in points:
        members[point.scan, point.level].add(point.reference_key)
    return {
        group: [{name: c[name] for name in _TOLD} for c in found if {c["from_key"], c["to_key"]} <= keys]
        for group, keys in members.items()
    }
