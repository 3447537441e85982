"""How much faster or slower than the scaling laws this machine is, method by method, from finished records.

Records of one method and one number of basis functions make a group; its ratio is their observed time
over their expected time, summed, so that totals come out right.  The factor at another size is the geometric
mean of the groups' ratios, those of near sizes counting most.
"""

from __future__ import annotations

import json
import math
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass, field
from itertools import chain, islice, zip_longest
from pathlib import Path
from typing import Any

from scission.forecast.cost import correlate_seconds, n_functions, reference_seconds
from scission.records.atomic import write_whole
from scission.records.fileformat import DamagedRecordError, unpack

CACHE = ".calibration.json"
FORMAT = 2
UNKNOWN = 3.0
"""Uncertainty, as a factor either way, of a method without records."""

_MALFORMED = (TypeError, ValueError, AttributeError, OverflowError)
_MOST_READ = 300
"""Records read of one campaign at most, of each kind half; spread over it, since keys are digests."""
_BASE = 0.5
"""Doubt (logarithm of a factor) that stays however many records there are: molecules differ in how many
iterations they take.  Leaving out one of H2O, OH, N2, F2, CH3OH and C2H6 in turn, the total of each came out within
1.4, but for F2 (1.7), whose references are hard."""

_NEAR = 0.05
_FULL_WEIGHT = 30
_EXTRAPOLATION = 0.5
"""Error of a power law's exponent that is allowed for beyond the sizes that were seen."""

_OPEN = ("UHF", "UKS", "ROHF")
_REFERENCE_FIXED_S = {"RHF": 0.05, "ROHF": 0.08, "RKS": 0.3, "UHF": 0.1, "UKS": 0.5, "CASSCF": 0.2}
_CORRELATION_FIXED_S = {"MP2": 0.05, "CCSD": 0.2, "CCSD(T)": 0.25, "FCI": 0.1, "NEVPT2": 0.05}
"""What a calculation takes whatever its size: own measurement on hydrogen in cc-pVDZ, one core.  Blocks are
sized without it, so that jobs of tiny points stay large."""


@dataclass(frozen=True)
class Group:
    """Records of one method and size: how many, and their observed over expected time."""

    n_basis: int
    ratio: float
    count: int


@dataclass(frozen=True)
class Calibration:
    """Groups of records by method; without any, the scaling laws stand as they are."""

    groups: dict[str, list[Group]] = field(default_factory=dict)

    def factor(self, method: str, n_basis: int) -> float:
        """Return by what the expected time of a calculation is to be multiplied."""
        found = self.groups.get(method, [])
        if not found:
            return 1.0
        weights = _weights(found, n_basis)
        logs = [math.log(group.ratio) for group in found]
        return math.exp(sum(w * x for w, x in zip(weights, logs, strict=True)) / sum(weights))

    def uncertainty(self, method: str, n_basis: int) -> float:
        """Return the factor, either way, within which the time is expected to lie."""
        found = self.groups.get(method, [])
        if not found:
            return UNKNOWN
        centre, weights = math.log(self.factor(method, n_basis)), _weights(found, n_basis)
        squares = [w * (math.log(g.ratio) - centre) ** 2 for w, g in zip(weights, found, strict=True)]
        away = min(abs(math.log(n_basis / group.n_basis)) for group in found)
        spread = _BASE**2 + sum(squares) / sum(weights) + (_EXTRAPOLATION * away) ** 2
        return min(UNKNOWN, math.exp(math.sqrt(spread)))

    @property
    def n_records(self) -> int:
        """Number of records behind it."""
        return sum(group.count for groups in self.groups.values() for group in groups)


def _weights(groups: list[Group], n_basis: int) -> list[float]:
    return [
        min(group.count, _FULL_WEIGHT) / (_NEAR + math.log(n_basis / group.n_basis) ** 2) for group in groups
    ]


def calibrate(results: Path, keep: bool = True) -> Calibration:
    """Return what the records of all campaigns below ``results`` teach.

    What was learnt is kept in ``results/.calibration.json``, so that only campaigns with new jobs are read
    again, and what a deleted campaign taught stays.

    Args:
        results: folder of the campaigns' folders.
        keep: False to write nothing.

    Raises:
        OSError: the results cannot be read, or the cache cannot be written.
    """
    kept = _read_cache(results / CACHE)
    campaigns: dict[str, Any] = dict(kept)
    for folder in sorted(path.parents[1] for path in results.glob("*/plan/plan.json")):
        stamp = _stamp(folder)
        if kept.get(folder.name, {}).get("stamp") != stamp:
            campaigns[folder.name] = {"stamp": stamp, "groups": _learn(folder)}
    if keep and campaigns != kept:
        text = json.dumps({"calibration": FORMAT, "campaigns": campaigns}, indent=1)
        write_whole(results / CACHE, text.encode())
    groups: dict[str, list[Group]] = defaultdict(list)
    for campaign in campaigns.values():
        for method, n_basis, ratio, count in campaign["groups"]:
            groups[method].append(Group(n_basis, ratio, count))
    return Calibration(dict(groups))


def _read_cache(path: Path) -> dict[str, Any]:
    """Return what was learnt before; nothing where the file is missing, of another format or damaged."""
    try:
        data = json.loads(path.read_bytes())
        campaigns: dict[str, Any] = {
            str(name): {
                "stamp": int(told["stamp"]),
                "groups": [[str(m), int(n), float(r), int(c)] for m, n, r, c in told["groups"]],
            }
            for name, told in data["campaigns"].items()
            if data["calibration"] == FORMAT
        }
    except (FileNotFoundError, ValueError, KeyError, TypeError, AttributeError):
        return {}
    sound = all(
        n > 0 and 0 < ratio < math.inf and count > 0
        for told in campaigns.values()
        for _, n, ratio, count in told["groups"]
    )
    return campaigns if sound else {}


def _stamp(folder: Path) -> int:
    jobs = folder / "jobs"
    return jobs.stat().st_mtime_ns if jobs.is_dir() else 0


def _learn(folder: Path) -> list[list[Any]]:
    """Return [method, basis functions, observed over expected time, records] of one campaign."""
    sums: dict[tuple[str, int], list[float]] = defaultdict(lambda: [0.0, 0.0, 0.0])
    half = _MOST_READ // 2
    for path in chain(islice(_files(folder / "records"), half), islice(_files(folder / "references"), half)):
        seen = _observation(path)
        if seen is not None:
            group, observed, expected = seen
            sums[group] = [a + b for a, b in zip(sums[group], (observed, expected, 1.0), strict=True)]
    return [[*group, o / e, int(n)] for group, (o, e, n) in sorted(sums.items())]


def _files(root: Path) -> Iterator[Path]:
    """Give the files below ``root`` one of each subfolder in turn, without listing more than needed."""
    if not root.is_dir():
        return
    folders = (path.glob("[!.]*.npz") for path in sorted(root.iterdir()) if path.is_dir())
    for turn in zip_longest(*folders):
        yield from (path for path in turn if path is not None)


def _observation(path: Path) -> tuple[tuple[str, int], float, float] | None:
    """Return ((method, basis functions), observed s, expected s) of a record that ran to its end."""
    try:
        with path.open("rb") as handle:
            head = unpack(handle, arrays=False)[0]
        inputs, wall = head["inputs"], float(head["scalars"]["wall_s"])
        if head["status"] not in ("converged", "unconverged") or "calculation" in inputs:
            return None
        method, expected = expectation(inputs)
        size = n_functions(inputs["molecule"], inputs["spec"])
        return ((method, size), wall, expected) if 0 < wall < math.inf and size else None
    except (FileNotFoundError, DamagedRecordError, LookupError, *_MALFORMED):
        return None  # no record to learn from: damaged, or without a cost


def expectation(work: dict[str, Any]) -> tuple[str, float]:
    """Return the method of a calculation and its expected seconds, what the smallest molecule takes included.

    Raises:
        KeyError: it computes nothing on its own, as a point without correlation does.
    """
    spec = work["spec"]
    if "correlation" not in work:
        fixed = _REFERENCE_FIXED_S.get(spec["reference"], _REFERENCE_FIXED_S["RHF"])
        return spec["reference"], fixed + reference_seconds(work["molecule"], spec)
    if "price" in work:
        return f"extra {work['calculation']}", correlate_seconds(work)
    if work["correlation"] == "none":
        raise KeyError("correlation")
    fixed = _CORRELATION_FIXED_S.get(work["correlation"], 0.1) * (3.0 if spec["reference"] in _OPEN else 1.0)
    return f"{work['correlation']} on {spec['reference']}", fixed + correlate_seconds(work)
