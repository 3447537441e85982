"""Expand a campaign into a plan."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from typing import Any

from scission import forecast
from scission.campaign import Campaign, Level, Scan
from scission.geometry import ScanPath, build_path, equilibrium_guess_angstrom
from scission.physics import PHYSICS_VERSION

from .blocks import correlate_jobs
from .chains import build_chain, merge_chains, molecule_facts
from .extras import add_extras
from .fragments import fragment_work
from .identity import canonical, point_keys, reference_keys, reference_spec
from .jobs import make_job, unique
from .stages import FEWEST_NODES, cut
from .types import Chain, Job, Plan, Point
from .write import campaign_digest

BLOCK_SECONDS = 30.0
"""Work given to one job on a local machine, by the forecast; a cluster's profile asks for more."""

_COSTLY = 2.0
"""A chain that takes longer than so many blocks is cut into stages."""

_CARRIES_AMPLITUDES = ("CCSD", "CCSD(T)")
_NEIGHBOURS = 8
"""Points over which amplitudes are carried at most; beyond that they have little to do with each other."""


def make_plan(campaign: Campaign, block_seconds: float = BLOCK_SECONDS) -> Plan:
    """Return every point and job of ``campaign``; blocks hold about ``block_seconds`` of forecast work."""
    points: list[Point] = []
    chains: list[Chain] = []
    work: list[dict[str, Any]] = []
    extra: list[dict[str, Any]] = []
    for scan_name, scan in campaign.scans.items():
        path = build_path(campaign.molecules[scan.molecule], scan)
        scan_points, scan_work = _expand_scan(campaign, scan_name, scan, path)
        scan_points, scan_extra = add_extras(campaign, scan_points, scan_work)
        points += scan_points
        work += scan_work
        extra += scan_extra
        chains += _scan_chains(campaign, scan_name, scan, path)
    publish = [w for w in work if w["correlation"] == "none"]
    jobs = _reference_jobs(merge_chains(chains), publish, block_seconds)
    owner = {
        key: job.id for job in jobs for key in job.payload["reference_keys"]
    }  # the last stage comes last
    jobs += correlate_jobs([w for w in work if w["correlation"] != "none"] + extra, owner, block_seconds)
    jobs += _fragment_jobs(campaign, points, owner)
    return Plan(
        campaign, tuple(points), tuple(jobs), PHYSICS_VERSION, campaign_digest(campaign, block_seconds)
    )


def _expand_scan(
    campaign: Campaign, name: str, scan: Scan, path: ScanPath
) -> tuple[list[Point], list[dict[str, Any]]]:
    """Return the points of a scan and the description of each point's calculation."""
    molecule = campaign.molecules[scan.molecule]
    facts, fragments = molecule_facts(molecule), [list(f) for f in path.fragments]
    coordinates = [tuple(row) for row in path.values.tolist()]
    positions = path.positions.tolist()  # one list a geometry, shared by all levels
    points, work = [], []
    for level_name in scan.levels:
        level = campaign.levels[level_name]
        spec = reference_spec(level, molecule)
        references = reference_keys(facts, spec, path.bonds, path.positions)
        keys = point_keys(references, level.correlation, level.correlates_valence_only)
        for i, (key, reference) in enumerate(zip(keys, references, strict=True)):
            points.append(Point(name, level_name, i + 1, coordinates[i], path.names, key, reference))
            work.append(_describe(level, facts, spec, points[-1], positions[i]) | {"fragments": fragments})
        if level.correlation in _CARRIES_AMPLITUDES:
            _add_neighbours(work[-len(keys) :], equilibrium_guess_angstrom(molecule, scan))
    return points, work


def _add_neighbours(items: list[dict[str, Any]], equilibrium: float) -> None:
    """Tell each point of a level which points lead to it from the equilibrium, nearest first."""
    middle = min(range(len(items)), key=lambda i: abs(items[i]["coordinate"][0] - equilibrium))
    told = [{k: item[k] for k in ("reference_key", "positions")} for item in items]
    for i, item in enumerate(items):
        inward = range(i - 1, middle - 1, -1) if i > middle else range(i + 1, middle + 1)
        item["neighbours"] = [told[j] for j in inward[:_NEIGHBOURS]]


def _describe(
    level: Level, facts: dict[str, Any], spec: dict[str, Any], point: Point, positions: Any
) -> dict[str, Any]:
    return {
        "kind": "correlate",
        "key": point.key,
        "reference_key": point.reference_key,
        "scan": point.scan,
        "level": point.level,
        "number": point.number,
        "coordinate": list(point.coordinate),
        "molecule": facts,
        "positions": positions,
        "spec": spec,
        "correlation": level.correlation,
        "frozen_core": level.correlates_valence_only,
    }


def _scan_chains(campaign: Campaign, name: str, scan: Scan, path: ScanPath) -> list[Chain]:
    """Return one chain for each different reference among the levels of a scan."""
    molecule = campaign.molecules[scan.molecule]
    specs: dict[str, dict[str, Any]] = {}
    for level_name in scan.levels:
        spec = reference_spec(campaign.levels[level_name], molecule)
        specs.setdefault(canonical(spec), spec)
    return [build_chain(name, molecule, scan, path, spec) for spec in specs.values()]


def _reference_jobs(
    chains: Sequence[Chain], publish: Sequence[dict[str, Any]], block_seconds: float
) -> list[Job]:
    """Return one job a group of chains that share a node: no two jobs ever write the same record.

    A long and costly chain that shares nothing gets three stages instead.
    """
    by_reference: dict[str, list[dict[str, Any]]] = defaultdict(list)
    for item in publish:
        by_reference[item["reference_key"]].append(item)
    jobs: list[Job] = []
    for group in _sharing(chains):
        keys = list(dict.fromkeys(n.key for c in group for n in c.nodes))
        published = unique(item for key in keys for item in by_reference[key])
        needs: tuple[str, ...] = ()
        if len(group) == 1 and len(keys) >= FEWEST_NODES and _seconds(group[0]) > _COSTLY * block_seconds:
            spec = group[0].spec
            spine, blocks = cut(group[0], careful=spec["follow"] == "lowest" or spec["reference"] == "CASSCF")
            jobs.append(_walkmake_job([spine.chain], spine.phase, (), []))
            stages = [_walkmake_job([b.chain], b.phase, (jobs[-1].id,), []) for b in blocks]
            jobs += stages
            needs = tuple(job.id for job in stages)
        jobs.append(_walkmake_job(group, "whole", needs, published))
    return jobs


def _walkmake_job(
    chains: Sequence[Chain], phase: str, needs: tuple[str, ...], published: list[dict[str, Any]]
) -> Job:
    """Return the job that walks some chains, or parts of one."""
    keys = list(dict.fromkeys(n.key for c in chains for n in c.nodes))
    seconds = sum(_seconds(c) for c in chains)
    memory = max(forecast.reference_memory_mb(c.molecule, c.spec) for c in chains)
    payload = {
        "chains": [{**_chain_payload(c), "phase": phase} for c in chains],
        "reference_keys": keys,
        "publish": published,
    }
    return make_job("reference", chains[0].name, needs, payload, len(keys), seconds, memory)


def _seconds(chain: Chain) -> float:
    return forecast.reference_seconds(chain.molecule, chain.spec) * len(chain.nodes)


def _fragment_jobs(campaign: Campaign, points: Sequence[Point], owner: dict[str, str]) -> list[Job]:
    """Return one job a scan, and one more for what needs references first; shared fragments come once."""
    groups: dict[tuple[str, tuple[str, ...]], list[dict[str, Any]]] = defaultdict(list)
    for item in fragment_work(campaign, points):
        needs = tuple(dict.fromkeys(owner[key] for key in item.get("share_from", ())))
        groups[item["scan"], needs].append(item)
    jobs = []
    for (scan, needs), items in groups.items():
        seconds = sum(forecast.fragment_seconds(item) for item in items)
        memory = max(forecast.correlate_memory_mb(item) for item in items)
        jobs.append(make_job("fragments", scan, needs, {"points": items}, len(items), seconds, memory))
    return jobs


def _chain_payload(chain: Chain) -> dict[str, Any]:
    return {
        "name": chain.name,
        "molecule": chain.molecule,
        "spec": chain.spec,
        "bonds": [list(b) for b in chain.bonds],
        "fragments": [list(f) for f in chain.fragments],
        "start": chain.start,
        "stretched": chain.stretched,
        "nodes": [
            {
                "key": n.key,
                "coordinate": n.coordinate,
                "positions": n.positions.tolist(),
                "auxiliary": n.auxiliary,
            }
            for n in chain.nodes
        ],
    }


def _sharing(chains: Sequence[Chain]) -> list[list[Chain]]:
    """Group chains that share a node, directly or through others."""
    groups: dict[int, list[Chain]] = {}
    group_of: dict[str, int] = {}
    for number, chain in enumerate(chains):
        keys = [node.key for node in chain.nodes]
        members = [chain]
        for other in sorted({group_of[key] for key in keys if key in group_of}):
            members = groups.pop(other) + members
        groups[number] = members
        group_of.update((node.key, number) for member in members for node in member.nodes)
    return list(groups.values())
