"""Extra calculations for costly diagnostics: small records of their own beside the points.

They have keys of their own, so that including one more computes only that one, and no record of a point
ever changes for it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from scission.campaign import Campaign
from scission.diagnostics import Calculation, calculations_for
from scission.physics import PHYSICS_VERSION

from .identity import canonical, digest
from .types import Point

_HAS_AMPLITUDES = ("CCSD", "CCSD(T)")
_CLOSED = ("RHF", "RKS")


def add_extras(
    campaign: Campaign, points: Sequence[Point], work: Sequence[dict[str, Any]]
) -> tuple[list[Point], list[dict[str, Any]]]:
    """Return the points of one scan with the keys of their extras, and the description of each extra.

    Args:
        campaign: for the diagnostics that it includes.
        points: points of one scan at all its levels.
        work: what computes each point, in the same order.
    """
    if not campaign.diagnostics.include:
        return list(points), []
    extras: list[dict[str, str]] = [{} for _ in points]
    items: dict[str, dict[str, Any]] = {}
    for calculation in calculations_for(campaign.diagnostics.include):
        levels = _levels(calculation, work)
        for at, item in enumerate(work):
            if item["level"] in levels:
                key = extra_key(calculation, item)
                extras[at][calculation.name] = key
                made_of = {"key": key, "calculation": calculation.name, "price": calculation.price}
                items.setdefault(key, {**item, **made_of})
    known = [replace(point, extras=tuple(e.items())) for point, e in zip(points, extras, strict=True)]
    return known, list(items.values())


def extra_key(calculation: Calculation, item: dict[str, Any]) -> str:
    """Return the key of an extra calculation on the reference of a point."""
    frozen = item["frozen_core"] if calculation.per_level else None
    return digest(canonical([PHYSICS_VERSION, "extra", calculation.name, item["reference_key"], frozen]))


def _levels(calculation: Calculation, work: Sequence[dict[str, Any]]) -> set[str]:
    """Return the levels whose points get the calculation.

    One that goes on from coupled cluster: every level with closed-shell amplitudes.  One that the geometry
    and the basis decide: one level for each basis, a restricted one where there is one.
    """
    if calculation.per_level:
        return {
            item["level"]
            for item in work
            if item["correlation"] in _HAS_AMPLITUDES and item["spec"]["reference"] == "RHF"
        }
    chosen: dict[str, str] = {}
    for item in sorted(work, key=lambda item: item["spec"]["reference"] not in _CLOSED):
        chosen.setdefault(canonical(item["spec"]["basis"]), item["level"])
    return set(chosen.values())
