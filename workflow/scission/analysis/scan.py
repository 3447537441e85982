"""One scan: the verdict on each point, the onsets of each diagnostic, the fits of each level."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from scission.analysis.onset_rows import onsets_of
from scission.campaign import Level
from scission.curves import Curve, FitReport, fit_curve
from scission.records import Planned, Record
from scission.thresholds import Thresholds
from scission.units import ANGSTROM_IN_BOHR
from scission.verdict import RULE, Comparison, Context, Flag, Onset, Rule, judge

RIPPLE = 1e-3
"""A dip shallower than this (hartree) is not taken for the well when energies are shown from its bottom."""

MULTIREFERENCE = "multireference"


@dataclass(frozen=True)
class Bond:
    """What the fits need to know of the bond: the reduced mass in electron masses, None for unknown."""

    reduced_mass: float | None
    diatomic: bool


@dataclass
class LevelResult:
    """One level of a scan: its points in the order of the scan, and what was concluded from them.

    ``fragment_sum`` is the lowest energy of the separate fragments, hartree, ``fragment_triples`` the part of
    (T) in it; NaN for unknown.
    """

    name: str
    level: Level
    points: list[Planned]
    records: list[Record]
    flags: list[Flag] = field(default_factory=list)
    onsets: dict[str, list[Onset]] = field(default_factory=dict)
    fits: FitReport | None = None
    fragment_sum: float = float("nan")
    fragment_triples: float = float("nan")
    comparison: Comparison | None = None

    @property
    def coordinate(self) -> np.ndarray:
        """First coordinate of each point, (n,), angstrom."""
        return np.array([point.coordinate[0] for point in self.points])

    @property
    def energy(self) -> np.ndarray:
        """Total energies, (n,), hartree; NaN where the calculation did not converge."""
        return np.array([_energy(record) for record in self.records])

    @property
    def bottom(self) -> float:
        """Energy of the innermost minimum that is no ripple, else of the lowest point; NaN for none.

        Far out a level that breaks down may fall below its own minimum: that is not its zero.
        """
        energy = self.energy[np.isfinite(self.energy)][np.argsort(self.coordinate[np.isfinite(self.energy)])]
        if not energy.size:
            return float("nan")
        for i in range(1, len(energy) - 1):
            rim = min(energy[:i].max(), energy[i:].max())
            if energy[i - 1] >= energy[i] <= energy[i + 1] and rim - energy[i] > RIPPLE:
                return float(energy[i])
        return float(energy.min())

    def values(self, diagnostic: str) -> np.ndarray:
        """Values of a diagnostic, (n,); NaN where it has none."""
        return np.array([record.diagnostics.get(diagnostic, np.nan) for record in self.records])


def _energy(record: Record) -> float:
    return float(record.scalars["energy"]) if record.status == "converged" else np.nan


def conclude(
    levels: Sequence[LevelResult],
    multiplicity: int,
    thresholds: Thresholds,
    bond: Bond,
    models: Sequence[str],
    rule: Rule = RULE,
) -> None:
    """Fill in flags, onsets and fits of all levels of one scan."""
    for result in levels:
        result.flags = _flags(result, levels, multiplicity, thresholds, rule)
        result.onsets = onsets_of(result, levels, multiplicity, thresholds)
        result.fits = fit_curve(_curve(result, bond), list(models))


def _flags(
    result: LevelResult, levels: Sequence[LevelResult], multiplicity: int, thresholds: Thresholds, rule: Rule
) -> list[Flag]:
    others = [other for other in levels if other is not result]
    by_number = [
        (other.name, {p.number: r for p, r in zip(other.points, other.records, strict=True)})
        for other in others
    ]
    flags = []
    for point, record in zip(result.points, result.records, strict=True):
        here = [(name, records[point.number]) for name, records in by_number if point.number in records]
        context = Context(multiplicity, _evidence(here), result.name)
        flags.append(judge(record.diagnostics, thresholds, context, rule))
    return flags


def _evidence(others: Sequence[tuple[str, Record]]) -> dict[str, tuple[float, str]]:
    """What converged calculations at other levels say of the geometry; the first level of the scan counts."""
    evidence: dict[str, tuple[float, str]] = {}
    for name, record in others:
        if record.status == "converged":
            for diagnostic, value in record.diagnostics.items():
                evidence.setdefault(diagnostic, (value, name))
    return evidence


def _curve(result: LevelResult, bond: Bond) -> Curve:
    why_not = [
        _why_not(result.level, record, flag)
        for record, flag in zip(result.records, result.flags, strict=True)
    ]
    return Curve(
        r=result.coordinate * ANGSTROM_IN_BOHR,
        energy=result.energy,
        usable=np.array([not reason for reason in why_not]),
        why_not=why_not,
        reduced_mass=bond.reduced_mass,
        diatomic=bond.diatomic,
        fragment_limit=result.fragment_sum if np.isfinite(result.fragment_sum) else None,
    )


def _why_not(level: Level, record: Record, flag: Flag) -> str:
    if record.status != "converged":
        return f"{record.status}: {record.reason}" if record.reason else record.status
    if flag.label == MULTIREFERENCE and not copes(level, record.scalars):
        return f"flagged {MULTIREFERENCE}"
    return ""


def copes(level: Level, scalars: Mapping[str, float]) -> bool:
    """Whether the energies of a level stay those of one whole well where the molecule is multireference.

    CASSCF and the pair functions do by their form, full CI always, and coupled cluster with singles and
    doubles for two electrons, where it is full CI.  An unrestricted determinant, and what is built on
    it, goes to the right far limit by giving up spin symmetry (textbook results).
    """
    exact_pair = level.correlation in ("CCSD", "CCSD(T)") and scalars.get("n_correlated") == 2
    whole = ("CASSCF", "UHF", "UKS", "PAIR", "PAIR+IONIC")
    return level.reference in whole or level.correlation == "FCI" or exact_pair
