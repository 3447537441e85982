"""Onsets of all diagnostics of a level, the Coulson-Fischer distance among them, and their rows."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import numpy as np

from scission.thresholds import Thresholds, threshold_for
from scission.units import BOHR_IN_ANGSTROM
from scission.verdict import Onset, onsets

if TYPE_CHECKING:
    from scission.analysis.scan import LevelResult

NEVER = "stays within the threshold at every known point"
ALWAYS = "over the threshold at every known point"
FOUND = "crosses the threshold; place by root finding"
RESTRICTED_TWIN = {"UHF": "RHF", "UKS": "RKS"}
_LEAVES_AT_BREAK = ("s2_excess", "uhf_luno", "uhf_hono", "n_d", "n_u", "n_u_squared", "y")


def onsets_of(
    result: LevelResult, levels: Sequence[LevelResult], multiplicity: int, thresholds: Thresholds
) -> dict[str, list[Onset]]:
    """Return the crossings of every diagnostic that has a threshold and a value at this level.

    A diagnostic without a crossing has one entry without a place that says why.
    """
    found: dict[str, list[Onset]] = {}
    for name in diagnostics_of(result):
        threshold = threshold_for(name, multiplicity, thresholds)
        values = result.values(name)
        if threshold is None or not np.isfinite(values).any():
            continue
        bound = threshold.scaled(multiplicity)[0]
        breaks = break_of(result, levels) if name in _LEAVES_AT_BREAK else None
        crossings = onsets(result.coordinate, values, bound, threshold.direction, breaks)
        if name == "triplet_stability" and bound == 0.0:
            crossings = _refined(crossings, result)
        found[name] = _in_words(crossings, result.coordinate, values)
    return found


def diagnostics_of(result: LevelResult) -> list[str]:
    """Names of all diagnostics with a value at any point, in the order of their first appearance."""
    return list(dict.fromkeys(name for record in result.records for name in record.diagnostics))


def break_of(result: LevelResult, levels: Sequence[LevelResult]) -> float | None:
    """Length (angstrom) where an unrestricted level's restricted twin turns unstable, if a level knows it."""
    mine = result.level
    twin = RESTRICTED_TWIN.get(mine.reference)
    for other in levels:
        same = (other.level.reference, other.level.basis, other.level.functional)
        if same != (twin, mine.basis, mine.functional):
            continue
        crossings = onsets(other.coordinate, other.values("triplet_stability"), 0.0, "below")
        for crossing in _refined(crossings, other):
            if np.isfinite(crossing.onset):
                return crossing.onset
    return None


def _refined(crossings: list[Onset], result: LevelResult) -> list[Onset]:
    """Put the places found by root finding where the interpolated ones are."""
    lengths = [
        r.scalars["coulson_fischer"] * BOHR_IN_ANGSTROM
        for r in result.records
        if "coulson_fischer" in r.scalars
    ]
    refined = []
    for crossing in crossings:
        inside = [x for x in lengths if crossing.lower <= x <= crossing.upper]
        refined.append(replace(crossing, onset=inside[0], note=FOUND) if inside else crossing)
    return refined


def _in_words(crossings: list[Onset], coordinate: np.ndarray, values: np.ndarray) -> list[Onset]:
    """Say how many crossings there are, which lie at the edge, and what it means that there is none."""
    if not crossings:
        return [Onset(np.nan, np.nan, np.nan, NEVER)]
    placed = [c for c in crossings if np.isfinite(c.onset)]
    if not placed:
        return [replace(crossings[0], note=ALWAYS)]
    known = np.sort(coordinate[np.isfinite(values)])
    words = []
    for number, crossing in enumerate(placed, start=1):
        note = crossing.note
        if len(placed) > 1:
            note += f" ({number} of {len(placed)} crossings)"
        if crossing.upper >= known[-1]:
            note += "; at the edge: the last known point is the only one beyond"
        if crossing.lower <= known[0]:
            note += "; at the edge: the first known point is the only one before"
        words.append(replace(crossing, note=note))
    return [c for c in crossings if not np.isfinite(c.onset)] + words


def onset_rows(
    result: LevelResult, scan: str, multiplicity: int, thresholds: Thresholds
) -> Iterator[dict[str, Any]]:
    """One row a crossing; one with an empty place for a diagnostic that crosses nowhere."""
    for name, crossings in result.onsets.items():
        threshold = threshold_for(name, multiplicity, thresholds)
        for crossing in crossings:
            yield {
                "scan": scan,
                "level": result.name,
                "diagnostic": name,
                "onset_angstrom": crossing.onset,
                "lower_angstrom": crossing.lower,
                "upper_angstrom": crossing.upper,
                "threshold": threshold.scaled(multiplicity)[0] if threshold else None,
                "what": crossing.note,
            }
