"""One job of a plan: its name, which follows from what it does, and what it asks for."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Any

from scission import forecast

from .identity import canonical, digest
from .types import Job


def make_job(
    stage: str,
    name: str,
    needs: tuple[str, ...],
    payload: dict[str, Any],
    n: int,
    seconds: float,
    memory: float,
) -> Job:
    """Return a job whose name follows from its content, with room over its forecast time and memory."""
    fingerprint = digest(canonical(_without_positions(payload)))[:10]
    runtime = math.ceil(10 + forecast.MARGIN * seconds / 60.0)
    label = name.split("+")[0]
    return Job(f"{stage}.{label}.{fingerprint}", stage, needs, n, math.ceil(memory), runtime, payload)


def _without_positions(payload: dict[str, Any]) -> dict[str, Any]:
    """Return what names a job: keys cover molecules and geometries, and writing out all takes long."""
    return {
        name: [_lean(item) for item in content] if name in ("points", "publish", "chains") else content
        for name, content in payload.items()
    }


def _lean(item: dict[str, Any]) -> dict[str, Any]:
    covered = ("positions", "molecule", "spec") if "key" in item else ("positions",)
    lean = {k: v for k, v in item.items() if k not in covered}
    if "neighbours" in lean:
        lean["neighbours"] = [n["reference_key"] for n in lean["neighbours"]]
    if "nodes" in lean:
        lean["nodes"] = [[n["key"], n["coordinate"], n["auxiliary"]] for n in lean["nodes"]]
    return lean


def unique(items: Iterable[dict[str, Any]]) -> list[dict[str, Any]]:
    """Return each calculation once."""
    return list({item["key"]: item for item in items}.values())
