"""Keep results/<campaign>/plan in step with the campaign file, without work when nothing changed.

This module imports neither the campaign's types nor chemistry until a plan has to be made, since the
engine reads the Snakefile, and with it this module, again in every job on a cluster.
"""

from __future__ import annotations

import csv
import hashlib
import io
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import yaml

from scission.execution.layout import Layout, read_json, write_json
from scission.records.atomic import write_whole

if TYPE_CHECKING:
    from scission.campaign import Campaign
    from scission.plan import Plan

POINT_COLUMNS = ("scan", "level", "point", "coordinate_angstrom", "key", "reference_key")


class PlanMissingError(Exception):
    """A job was started although its campaign has no plan."""


def fingerprint(campaign_file: Path, xyz_files: Iterable[Path], options: dict[str, Any]) -> str:
    """Return a digest of all that a plan is made from: files, options and the program's own text."""
    state = hashlib.sha256(repr(sorted(options.items())).encode())
    package = Path(__file__).resolve().parents[1]
    sources = sorted(p for p in package.rglob("*") if p.suffix in (".py", ".json", ".csv"))
    for path in [campaign_file, *sorted(xyz_files), *sources]:
        state.update(
            str(path).encode() + b"\0" + (path.read_bytes() if path.is_file() else b"absent") + b"\0"
        )
    return state.hexdigest()


def read_config(campaign_file: Path) -> dict[str, Any]:
    """Return the campaign as plain data, as the engine reads it; for files that have been checked."""
    data = yaml.safe_load(campaign_file.read_bytes())
    return data if isinstance(data, dict) else {}


def xyz_files(config: dict[str, Any], campaign_file: Path) -> list[Path]:
    """Return the xyz files that a campaign, as read by the engine, names."""
    molecules = config.get("molecules")
    entries = molecules.values() if isinstance(molecules, dict) else []
    names = [entry.get("xyz") for entry in entries if isinstance(entry, dict)]
    return [campaign_file.parent / name for name in names if isinstance(name, str)]


def plan_options(config: Mapping[str, Any]) -> dict[str, Any]:
    """Return what besides the campaign file decides the plan, out of the engine's settings.

    Raises:
        ValueError: a setting that is not a positive number.
    """
    if "block_seconds" not in config:
        return {}
    try:
        seconds = float(config["block_seconds"])
    except (TypeError, ValueError):
        seconds = 0.0
    if not 0.0 < seconds < float("inf"):
        raise ValueError(f"setting block_seconds: {config['block_seconds']!r} is not a positive number")
    return {"block_seconds": seconds}


def current_index(layout: Layout, stamp: str) -> dict[str, Any] | None:
    """Return the plan's index if it was made from exactly what ``stamp`` (see fingerprint) says."""
    kept = read_json(layout.plan / "stamp.json")
    if kept is None or kept.get("stamp") != stamp:
        return None
    return read_json(layout.plan / "plan.json")


def refresh(
    config: dict[str, Any],
    campaign_file: Path,
    results: Path,
    options: dict[str, Any],
    may_write: bool = True,
) -> tuple[Layout, dict[str, Any]]:
    """Return the layout and the plan's index of a campaign, after making the plan if it is out of date.

    Args:
        config: the campaign as the engine read it; only names of xyz files are taken from it.
        results: the results folder; the campaign's name is added.
        options: what else decides the plan (``block_seconds``).
        may_write: False inside the engine's jobs, which take the plan as it is.

    Raises:
        CampaignError: the campaign file is wrong; holds every problem.
        PlanMissingError: there is no plan and ``may_write`` is False.
    """
    layout = Layout(results / str(config.get("campaign")))
    if not may_write:
        index = read_json(layout.plan / "plan.json")
        if index is None:
            raise PlanMissingError(f"{layout.plan / 'plan.json'} is missing; start the campaign anew")
        return layout, index
    stamp = fingerprint(campaign_file, xyz_files(config, campaign_file), options)
    index = current_index(layout, stamp)
    if index is None:
        layout, index = make(campaign_file, results, stamp, options)
    return layout, index


def make(
    campaign_file: Path, results: Path, stamp: str, options: dict[str, Any]
) -> tuple[Layout, dict[str, Any]]:
    """Read the campaign file, make its plan and write it.

    Raises:
        CampaignError: the campaign file is wrong; holds every problem.
    """
    from scission.campaign import load_campaign
    from scission.diagnostics import DIAGNOSTICS

    campaign = load_campaign(campaign_file, DIAGNOSTICS)
    layout = Layout(results / campaign.name)
    write(expand(campaign, options), layout)
    made_from = {"stamp": stamp, "source": str(campaign_file.absolute()), "options": options}
    write_json(layout.plan / "stamp.json", made_from)
    index = read_json(layout.plan / "plan.json")
    assert index is not None
    return layout, index


def expand(campaign: Campaign, options: dict[str, Any]) -> Plan:
    """Return the plan of a campaign; ``options`` may hold ``block_seconds``."""
    from scission.plan import make_plan

    block = options.get("block_seconds")
    return make_plan(campaign) if block is None else make_plan(campaign, block_seconds=block)


def write(plan: Plan, layout: Layout) -> None:
    """Write a plan and its list of points; files that say the same already are left alone."""
    from scission.plan import write_plan

    old = read_json(layout.plan / "plan.json") or {}
    jobs = {entry["job"] for entry in old.get("jobs", [])}
    if old.get("digest") != plan.digest or jobs != {job.id for job in plan.jobs}:
        write_plan(plan, layout.plan)
    write_whole(layout.plan / "points.csv", _points_csv(plan))


def _points_csv(plan: Plan) -> bytes:
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(POINT_COLUMNS)
    for p in plan.points:
        writer.writerow([p.scan, p.level, p.number, repr(p.coordinate[0]), p.key, p.reference_key])
    return text.getvalue().encode()


def read_points(layout: Layout) -> list[dict[str, str]]:
    """Return the planned points as rows with the columns of ``POINT_COLUMNS``.

    Raises:
        FileNotFoundError: the campaign has no plan yet.
    """
    with (layout.plan / "points.csv").open(encoding="utf-8", newline="") as handle:
        return list(csv.DictReader(handle))
