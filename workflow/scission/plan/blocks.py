"""Blocks of correlated points: what one job of a cluster computes one after another."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator, Sequence
from typing import Any

from scission import forecast

from .jobs import make_job, unique
from .types import Job

Item = dict[str, Any]


def correlate_jobs(work: Sequence[Item], owner: dict[str, str], block_seconds: float) -> list[Job]:
    """Return blocks of consecutive geometries of a scan, sized by the forecast.

    Levels on the same references go together: at each geometry they share integrals, orbitals, amplitudes.

    Args:
        work: what computes each point, by scan and level in the order of the coordinate.
        owner: reference key -> name of the job that establishes it.
        block_seconds: work for one job; a geometry that takes longer is a job of its own.
    """
    jobs = []
    for name, geometries in _families(work):
        seconds = sum(forecast.correlate_seconds(item) for item in geometries[0])
        memory = max(forecast.correlate_memory_mb(item) for item in geometries[0])
        size = max(1, math.floor(block_seconds / seconds))
        n_blocks = math.ceil(len(geometries) / size)
        for b in range(n_blocks):
            some = geometries[b * len(geometries) // n_blocks : (b + 1) * len(geometries) // n_blocks]
            block = [item for items in some for item in items]
            needs = tuple(dict.fromkeys(owner[item["reference_key"]] for item in block))
            payload = {"points": block}
            jobs.append(make_job("correlate", name, needs, payload, len(block), seconds * len(some), memory))
    return jobs


def _families(work: Sequence[Item]) -> Iterator[tuple[str, list[list[Item]]]]:
    """Give (name, calculations by geometry) of the levels of a scan that have their references in common."""
    levels: dict[tuple[str, ...], list[Item]] = defaultdict(list)
    for item in unique(work):
        calculation = [item["calculation"]] if "calculation" in item else []
        levels[item["scan"], item["level"], *calculation].append(item)
    families: dict[tuple[str, ...], list[tuple[str, ...]]] = defaultdict(list)
    for level, items in levels.items():
        scan, _, *extra = level
        families[scan, items[0]["reference_key"], *extra].append(level)
    for members in families.values():
        geometries: dict[str, list[Item]] = defaultdict(list)
        for level in members:
            for item in levels[level]:
                geometries[item["reference_key"]].append(item)
        yield _name(members), sorted(geometries.values(), key=lambda items: items[0]["number"])


def _name(members: Sequence[tuple[str, ...]]) -> str:
    scan, level, *extra = members[0]
    others = f"-and-{len(members) - 1}-more" if len(members) > 1 else ""
    return ".".join([scan, level + others, *extra])
