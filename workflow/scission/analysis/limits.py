"""Where each level goes when the bond is broken, against the energies of the separate fragments."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np

from scission.analysis.scan import LevelResult
from scission.campaign import Campaign, Level, Molecule
from scission.curves import LOCAL
from scission.geometry import build_path
from scission.plan.fragments import Split, fragment_splits
from scission.records import Record, Store
from scission.units import ANGSTROM_IN_BOHR, HARTREE_IN_EV, HARTREE_IN_KCAL_PER_MOL

MODEL = "fragments"
"""Name under which the table of fits lists D_e against the fragments."""

SEPARATED_ANGSTROM = 5.0
SEPARATED_RATIO = 2.5
"""A far end is judged from 5 angstrom on, and from 2.5 times the length of the minimum: covalent fragments
are within 1 kcal/mol of their limit there (own measurement: F2, HF, H2, N2, LiH, water)."""

TOLERANCE = 1.0 / HARTREE_IN_KCAL_PER_MOL
"""Chemical accuracy, 1 kcal/mol: common practice, no source."""

NEAR_IONIC = 0.05
"""Within so many hartree of separate ions, their attraction included, the far end is called ionic."""

CLOSED_SHELL = ("RHF", "RKS")
_PERTURBATIVE = ("MP2", "CCSD", "CCSD(T)", "NEVPT2")
_CHARGES = {0: "", 1: "+", -1: "-"}
_SPINS = {1: "singlet", 2: "doublet", 3: "triplet", 4: "quartet", 5: "quintet", 6: "sextet", 7: "septet"}


@dataclass(frozen=True)
class Sums:
    """Sums of the fragments' energies, hartree (NaN for none), with the fragments in words.

    ``neutral`` is the lowest sum that leaves the charge where it belongs, ``ionic`` the lowest with one
    electron moved; ``open_shell`` says whether the neutral fragments have unpaired electrons; ``problem``
    why there is no neutral sum, or which fragments of it are missing; ``triples`` is the part of (T) in it.
    """

    neutral: float = float("nan")
    ionic: float = float("nan")
    neutral_words: str = ""
    ionic_words: str = ""
    open_shell: bool = True
    problem: str = ""
    triples: float = float("nan")


@dataclass(frozen=True)
class Limit:
    """The far end of one level: ``kind`` in one or two words, ``what`` in a sentence."""

    coordinate: float
    energy: float
    sums: Sums
    kind: str
    what: str

    @property
    def difference(self) -> float:
        """Far energy minus fragment sum, hartree."""
        return self.energy - self.sums.neutral


def fragment_sums(campaign: Campaign, scan: str, level: Level, store: Store) -> Sums:
    """Return the lowest sums of a scan's fragments at a level, from their records."""
    molecule = campaign.molecules[campaign.scans[scan].molecule]
    path = build_path(molecule, campaign.scans[scan])
    splits = fragment_splits(molecule, level, path)
    records = {s.key: store.read("fragment", s.key, arrays=False) for split in splits for s in split.states}
    found = [(_sum(split, records), split) for split in splits]
    neutral = [(e, s) for e, s in found if not s.ionic and np.isfinite(e)]
    ionic = [(e, s) for e, s in found if s.ionic and np.isfinite(e)]
    lost = _lost(records, [s for s in splits if not s.ionic])
    if not neutral:
        return Sums(problem=lost or "the scan does not leave two fragments")
    lowest, best = min(neutral, key=lambda pair: pair[0])
    low_ionic = min(ionic, key=lambda pair: pair[0], default=None)
    return Sums(
        lowest,
        low_ionic[0] if low_ionic else float("nan"),
        _words(molecule, path.fragments, best, spins=True),
        _words(molecule, path.fragments, low_ionic[1], spins=False) if low_ionic else "",
        any(state.multiplicity > 1 for state in best.states),
        lost,
        _triples(best, records),
    )


def _sum(split: Split, records: dict[str, Record | None]) -> float:
    total = 0.0
    for state in split.states:
        record = records[state.key]
        good = record is not None and record.status == "converged"
        total += float(record.scalars["energy"]) if good and record is not None else float("nan")
    return total


def _triples(split: Split, records: dict[str, Record | None]) -> float:
    """Sum of the fragments' (T) energies, hartree; fragments of too few electrons have none."""
    found = [records[state.key] for state in split.states]
    return sum(float(r.scalars.get("energy_triples", 0.0)) for r in found if r is not None)


def _lost(records: dict[str, Record | None], splits: Iterable[Split]) -> str:
    """What happened to fragments without an energy, other than that the level has no such state."""
    words = {}
    for state in (state for split in splits for state in split.states):
        record = records[state.key]
        if record is None:
            words[state.key] = "a fragment has no record"
        elif record.status != "converged" and record.reason != "not-defined":
            name = "".join(state.work["molecule"]["symbols"])
            spin = _SPINS.get(state.multiplicity, str(state.multiplicity))
            words[state.key] = f"fragment {name} {spin}: {record.message}"
    return "; ".join(dict.fromkeys(words.values()))


def _words(molecule: Molecule, fragments: tuple[tuple[int, ...], ...], split: Split, spins: bool) -> str:
    parts = []
    for state, atoms in zip(split.states, fragments, strict=True):
        name = _formula([molecule.symbols[a] for a in atoms]) + _CHARGES.get(
            state.charge, f"({state.charge:+d})"
        )
        spin = _SPINS.get(state.multiplicity, f"multiplicity {state.multiplicity}")
        parts.append(f"{name} {spin}" if spins else name)
    return " + ".join(parts)


def _formula(symbols: list[str]) -> str:
    """Sum formula, elements in the order given."""
    return "".join(
        s + (str(symbols.count(s)) if symbols.count(s) > 1 else "") for s in dict.fromkeys(symbols)
    )


def far_limit(result: LevelResult, sums: Sums, spin: float) -> Limit:
    """Judge the farthest converged point of a level against the fragments.

    Args:
        spin: S of the molecule.
    """
    known = np.flatnonzero(np.isfinite(result.energy))
    if known.size == 0:
        return Limit(np.nan, np.nan, sums, "unknown", "no point has a result")
    at = int(known[np.argmax(result.coordinate[known])])
    x, energy = float(result.coordinate[at]), float(result.energy[at])
    if not np.isfinite(sums.neutral):
        return Limit(x, energy, sums, "unknown", f"the fragments' energies are not known: {sums.problem}")
    reach = max(SEPARATED_ANGSTROM, SEPARATED_RATIO * minimum_length(result))
    if x < reach - 1e-9:
        ends = "the scan ends" if x >= result.coordinate.max() - 1e-9 else "the last point with a result lies"
        words = (
            f"{ends} at {x:.2f} angstrom, before the fragments are apart ({reach:.1f} angstrom): not judged"
        )
        return Limit(x, energy, sums, "not separated", words)
    kind, words = _judge(result, at, energy - sums.neutral, sums, spin)
    return Limit(x, energy, sums, kind, words)


def minimum_length(result: LevelResult) -> float:
    """Length at the bottom of the well, angstrom; 0 where there is no energy."""
    known = np.flatnonzero(np.isfinite(result.energy))
    if known.size == 0:
        return 0.0
    nearest = np.argmin(np.abs(result.energy[known] - result.bottom))
    return float(result.coordinate[known[nearest]])


def _judge(result: LevelResult, at: int, difference: float, sums: Sums, spin: float) -> tuple[str, str]:
    level, kcal = result.level, difference * HARTREE_IN_KCAL_PER_MOL
    closed = level.reference in (*CLOSED_SHELL, "ORBITAL") and level.correlation != "FCI" and sums.open_shell
    if abs(difference) <= TOLERANCE:
        return _right(result, at, kcal, sums, spin)
    if difference < 0.0:
        return _below(level, kcal, closed, sums)
    if closed and level.correlation == "none":
        return _ionic(result, at, difference, sums)
    words = f"ends {kcal:.1f} kcal/mol above {sums.neutral_words}"
    if level.reference == "PAIR":
        return "wrong limit", f"{words}: a covalent pair function leaves one electron on each atom"
    if closed:
        return (
            "wrong limit",
            f"{words}: {level.correlation} does not remove the ionic terms of the closed shell",
        )
    if level.reference == "CASSCF":
        cause = (
            "averaged states"
            if level.states > 1
            else "the active space follows another state or lacks an orbital"
        )
        return "too high", f"{words}: {cause}"
    return "too high", f"{words}: the solution followed is not the lowest one there"


def _right(result: LevelResult, at: int, kcal: float, sums: Sums, spin: float) -> tuple[str, str]:
    words = f"goes to {sums.neutral_words} ({round(kcal, 2) + 0.0:+.2f} kcal/mol)"
    s2 = result.records[at].diagnostics.get("s2", np.nan)
    proper = spin * (spin + 1.0)
    unrestricted = result.level.reference in ("UHF", "UKS") and result.level.correlation != "FCI"
    if unrestricted and s2 - proper > 0.1:
        mixed = f"<S^2> is {s2:.2f}, the state asked for has {proper:.2f}"
        return "fragments, broken spin", f"{words}, but with broken spin: {mixed}"
    return "fragments", words


def _below(level: Level, kcal: float, closed: bool, sums: Sums) -> tuple[str, str]:
    words = f"ends {-kcal:.1f} kcal/mol below {sums.neutral_words}"
    if level.correlation in _PERTURBATIVE and closed:
        return (
            "breaks down",
            f"{words}: {level.correlation} breaks down where its determinant does not describe the bond",
        )
    if level.correlation in ("MP2", "NEVPT2"):
        return (
            "too low",
            f"{words}: perturbation theory overshoots, or the fragments still attract each other",
        )
    return (
        "too low",
        f"{words}: the fragments still attract each other, or a fragment was not found at its lowest",
    )


def _ionic(result: LevelResult, at: int, difference: float, sums: Sums) -> tuple[str, str]:
    """Name the limit of a closed-shell determinant: ions, or as much ion as neutral fragment."""
    above = f"ends {difference * HARTREE_IN_EV:.1f} eV above {sums.neutral_words}"
    if not np.isfinite(sums.ionic):
        return "ionic", f"{above}: a closed-shell determinant keeps ionic terms when the bond is broken"
    attraction = -1.0 / (result.coordinate[at] * ANGSTROM_IN_BOHR)
    ions = sums.ionic - sums.neutral
    gap = f"{sums.ionic_words} lies {ions * HARTREE_IN_EV:.1f} eV above the neutral fragments"
    if abs(difference - ions - attraction) < NEAR_IONIC:
        return "ionic", f"{above}: it is {sums.ionic_words} with their attraction, -1/R; {gap}"
    words = f"{above}: a closed-shell determinant keeps ionic terms, here a mixture with {sums.ionic_words}"
    return "part ionic", f"{words}; {gap}"


def limit_row(scan: str, level: str, limit: Limit, depth_ev: float) -> dict[str, Any]:
    """Return the row of the table ``limits``; ``depth_ev`` is D_e against the fragments."""
    difference = limit.difference
    return {
        "scan": scan,
        "level": level,
        "coordinate_angstrom": limit.coordinate,
        "far_energy_hartree": limit.energy,
        "fragment_sum_hartree": limit.sums.neutral,
        "difference_kcal_per_mol": difference * HARTREE_IN_KCAL_PER_MOL,
        "difference_ev": difference * HARTREE_IN_EV,
        "ionic_sum_hartree": limit.sums.ionic,
        "limit": limit.kind,
        "what": limit.what,
        "fragments": limit.sums.neutral_words,
        "ions": limit.sums.ionic_words,
        "d_e_ev": depth_ev,
        "remark": limit.sums.problem,
    }


def depth_against_fragments(result: LevelResult) -> tuple[float, float]:
    """D_e of a level against its fragments and its standard error, eV.

    From the fitted minimum, or, without a standard error, from the lowest grid point of the well.
    """
    fit = result.fits.fit(LOCAL) if result.fits else None
    if fit is not None and fit.fitted and np.isfinite(result.fragment_sum):
        return fit.value("D_e"), fit.stderr("D_e")
    return (result.fragment_sum - result.bottom) * HARTREE_IN_EV, float("nan")


def depth_row(scan: str, level: str, depth: tuple[float, float]) -> dict[str, Any]:
    """Return the row of the table ``fits`` for D_e against the fragments."""
    value, error = depth
    row = {"scan": scan, "level": level, "model": MODEL, "quantity": "D_e", "unit": "eV", "preferred": False}
    return row | {"value": value, "stderr": error}
