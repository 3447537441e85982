"""Levels against the campaign's reference level, stretches of one flag, and the scorecard of diagnostics."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from scission.analysis.scan import LevelResult, copes
from scission.thresholds import Thresholds, threshold_for
from scission.units import HARTREE_IN_KCAL_PER_MOL
from scission.verdict import Comparison, Edge, Score, compare, score

Row = dict[str, Any]

SHARE_OF_DEPTH = 0.5
"""The (T) share of the binding energy is formed where at least this part of the largest binding is left."""


def add_tae_share(result: LevelResult) -> None:
    """Give the points of a CCSD(T) level the share of (T) in the binding energy, percent.

    Only about the minimum: farther out the binding energy it is a share of goes to zero.
    """
    binding = result.fragment_sum - result.energy
    if result.level.correlation != "CCSD(T)" or not np.isfinite(result.fragment_triples):
        return
    if not np.isfinite(binding).any():
        return
    for record, energy in zip(result.records, binding, strict=True):
        triples = record.scalars.get("energy_triples")
        if (
            triples is None
            or record.scalars.get("n_correlated", 0) < 3
            or not energy > SHARE_OF_DEPTH * np.nanmax(binding)
        ):
            record.absent["tae_share"] = "no triples, or too little of the binding energy is left here"
            continue
        record.absent.pop("tae_share", None)
        record.diagnostics["tae_share"] = 100.0 * (result.fragment_triples - triples) / float(energy)


def compare_levels(levels: Sequence[LevelResult], reference_level: str | None, tolerance: float) -> None:
    """Fill in the comparison of every level with the reference level; ``tolerance`` in hartree."""
    reference = next((level for level in levels if level.name == reference_level), None)
    if reference is None:
        return
    known = {p.number: e for p, e in zip(reference.points, reference.energy, strict=True)}
    for result in levels:
        if result is not reference:
            against = np.array([known.get(p.number, np.nan) for p in result.points])
            result.comparison = compare(result.coordinate, result.energy, against, tolerance)


def comparison_rows(result: LevelResult, scan: str, reference_level: str, tolerance: float) -> Iterator[Row]:
    """Rows of the table ``comparison``; ``tolerance`` in kcal/mol."""
    found = result.comparison
    if found is None:
        return
    head = {"scan": scan, "level": result.name, "reference_level": reference_level}
    if found.problem:
        yield head | {"quantity": "compared_points", "value": 0.0, "unit": "1", "what": found.problem}
        return
    for quantity, value, unit, what in _quantities(found, tolerance):
        yield head | {"quantity": quantity, "value": value, "unit": unit, "what": what}


def _quantities(found: Comparison, tolerance: float) -> Iterator[tuple[str, float, str, str]]:
    kcal = HARTREE_IN_KCAL_PER_MOL
    zero = f"zero at the reference level's minimum, {found.minimum:.4f} angstrom"
    yield "npe", found.npe * kcal, "kcal/mol", "non-parallelity error: largest less smallest error"
    yield "largest_error", found.largest * kcal, "kcal/mol", f"of largest magnitude, with its sign; {zero}"
    yield "largest_error_at", found.largest_at, "angstrom", "length of the largest error"
    yield (
        "mean_absolute_error",
        found.mean_absolute * kcal,
        "kcal/mol",
        "over all points that have both results",
    )
    yield "compared_points", float(np.isfinite(found.error).sum()), "1", "points that have both results"
    yield "tolerance", tolerance, "kcal/mol", "error up to which the level is trusted"
    for side, edge in (("from", found.inner), ("to", found.outer)):
        if edge is not None:
            yield from _edge(side, edge)


def _edge(side: str, edge: Edge) -> Iterator[tuple[str, float, str, str]]:
    yield f"trusted_{side}", edge.place, "angstrom", edge.note
    yield f"trusted_{side}_lower", edge.lower, "angstrom", "known point on the shorter side of this end"
    yield f"trusted_{side}_upper", edge.upper, "angstrom", "known point on the longer side of this end"


def verdict_rows(result: LevelResult, scan: str) -> Iterator[Row]:
    """One row for each stretch of neighbouring points with one flag, with the reasons at its first point."""
    order = np.argsort(result.coordinate, kind="stable")
    start = 0
    for i in range(1, len(order) + 1):
        same = i < len(order) and result.flags[order[i]].label == result.flags[order[start]].label
        if same:
            continue
        first, last = order[start], order[i - 1]
        yield {
            "scan": scan,
            "level": result.name,
            "flag": result.flags[first].label,
            "from_angstrom": float(result.coordinate[first]),
            "to_angstrom": float(result.coordinate[last]),
            "points": i - start,
            "reasons": "; ".join(result.flags[first].reasons),
        }
        start = i


@dataclass
class Scorecard:
    """Collects values of diagnostics and errors of levels over the scans of a campaign."""

    tolerance: float
    values: dict[tuple[str, str, int], list[float]] = field(default_factory=dict)
    wrong: dict[tuple[str, str, int], list[bool]] = field(default_factory=dict)
    late: dict[tuple[str, str, int], list[float]] = field(default_factory=dict)

    def add(self, levels: Sequence[LevelResult], multiplicity: int, thresholds: Thresholds) -> None:
        """Take the points of one scan, from the minimum outward, at every level that was compared.

        A level that copes with broken bonds (CASSCF, full CI) is not what diagnostics warn of.
        """
        names = {name for level in levels for record in level.records for name in record.diagnostics}
        for result in levels:
            if result.comparison is None or result.comparison.problem or _foretold(result):
                continue
            for name in sorted(names):
                if threshold_for(name, multiplicity, thresholds) is not None:
                    self._add(name, result, levels, multiplicity)

    def _add(self, name: str, result: LevelResult, levels: Sequence[LevelResult], multiplicity: int) -> None:
        assert result.comparison is not None
        source = _source(name, result, levels)
        if source is None:
            return
        known = {p.number: v for p, v in zip(source.points, source.values(name), strict=True)}
        key = (name, result.name, multiplicity)
        for point, error in zip(result.points, result.comparison.error, strict=True):
            value = known.get(point.number, np.nan)
            if point.coordinate[0] >= result.comparison.minimum and np.isfinite(error) and np.isfinite(value):
                self.values.setdefault(key, []).append(float(value))
                self.wrong.setdefault(key, []).append(bool(abs(error) > self.tolerance))
        outer = result.comparison.outer
        places = [c.onset for c in source.onsets.get(name, []) if c.onset > result.comparison.minimum]
        if outer is not None and not outer.open and places:
            self.late.setdefault(key, []).append(places[0] - outer.place)

    def rows(self, thresholds: Thresholds) -> Iterator[Row]:
        """Rows of the table ``scorecard``, one for each diagnostic, level and kind of threshold."""
        for key, values in self.values.items():
            name, level, multiplicity = key
            threshold = threshold_for(name, multiplicity, thresholds)
            if threshold is None:
                continue
            bound = threshold.scaled(multiplicity)[0]
            wrong = np.array(self.wrong[key])
            found = score(np.array(values), wrong, bound, threshold.direction, self.late.get(key, ()))
            yield {"diagnostic": name, "level": level, "threshold": bound} | _score_row(found)


def _score_row(found: Score) -> Row:
    at, best = found.at_threshold, found.at_best
    late = found.late
    return {
        "hits": at.hits,
        "misses": at.misses,
        "false_alarms": at.false_alarms,
        "correct": at.correct,
        "skill": at.skill,
        "best_threshold": found.best,
        "best_hits": best.hits if best else None,
        "best_misses": best.misses if best else None,
        "best_false_alarms": best.false_alarms if best else None,
        "best_skill": best.skill if best else None,
        "late_angstrom": float(late.mean()) if late.size else None,
        "earliest_angstrom": float(late.min()) if late.size else None,
        "latest_angstrom": float(late.max()) if late.size else None,
        "scans": int(late.size),
    }


def _foretold(result: LevelResult) -> bool:
    """Whether a level copes with broken bonds by its form, so that no diagnostic need warn of it."""
    unrestricted = result.level.reference in ("UHF", "UKS") and result.level.correlation != "FCI"
    scalars: Mapping[str, float] = next((r.scalars for r in result.records if r.status == "converged"), {})
    return copes(result.level, scalars) and not unrestricted


def _source(name: str, result: LevelResult, levels: Sequence[LevelResult]) -> LevelResult | None:
    """The level whose value of a diagnostic counts, as in the verdict: the level itself, else the first."""
    ordered = [result, *(other for other in levels if other is not result)]
    return next((level for level in ordered if np.isfinite(level.values(name)).any()), None)
