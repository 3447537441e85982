"""The fragments that a broken bond leaves, at each level, in every charge and spin that may count.

Only spins that can couple to the molecule's are planned; which of them lies lowest is seen in the results.
A fragment's key covers its own geometry, charge, multiplicity and method, so that scans share it.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from scission.campaign import Campaign, Level, Molecule
from scission.campaign.names import ELEMENTS
from scission.geometry import ScanPath, build_path
from scission.physics import PHYSICS_VERSION

from .identity import canonical, digest, geometry_bytes
from .types import Point

RESTRICTED = ("RHF", "ROHF", "PAIR", "ORBITAL", "PAIR+IONIC")
"""References whose fragments are restricted determinants: RHF for closed shells, ROHF for open ones."""

KOHN_SHAM = ("RKS", "UKS")

_SHELLS = ((2, 10, 2), (10, 18, 10), (18, 20, 18), (28, 36, 28), (36, 38, 36), (46, 54, 46), (54, 56, 54))
"""Electrons of atoms without open d shells: above, up to, and how many of them are core."""

_MOST_OPEN = 6
_SMALL_GROUP = 3


@dataclass(frozen=True)
class FragmentState:
    """One fragment in one charge and spin: ``which`` is 0 or 1, ``work`` what its task has to know."""

    which: int
    charge: int
    multiplicity: int
    key: str
    work: dict[str, Any]


@dataclass(frozen=True)
class Split:
    """One way to share charge and spin; ``ionic`` if charge moved from one fragment to the other."""

    states: tuple[FragmentState, FragmentState]
    ionic: bool


def fragment_work(campaign: Campaign, points: Sequence[Point]) -> list[dict[str, Any]]:
    """Return the calculations of the fragments that the scans leave, each once, as the worker's tasks.

    Those of an active space take their share of it from a reference of the scan, the farthest that succeeds.
    """
    work: dict[str, dict[str, Any]] = {}
    references: dict[tuple[str, str], list[str]] = defaultdict(list)
    for point in points:
        references[point.scan, point.level].append(point.reference_key)
    for scan_name, scan in campaign.scans.items():
        molecule = campaign.molecules[scan.molecule]
        path = build_path(molecule, scan)
        for name in scan.levels:
            level = campaign.levels[name]
            shares = {"share_from": references[scan_name, name][::-1]} if level.reference == "CASSCF" else {}
            for split in fragment_splits(molecule, level, path):
                for state in split.states:
                    work.setdefault(state.key, {**state.work, **shares, "scan": scan_name, "level": name})
    return list(work.values())


def fragment_splits(molecule: Molecule, level: Level, path: ScanPath) -> list[Split]:
    """Return every split of charge and spin at a level; empty where the scan does not leave two fragments."""
    if len(path.fragments) != 2:
        return []
    wanted = molecule.multiplicity - 1
    splits = []
    for charges in charge_splits(molecule.charge):
        for unpaired in _coupled(molecule, path.fragments, charges, wanted):
            a, b = (_state(molecule, level, path, i, charges[i], unpaired[i]) for i in (0, 1))
            splits.append(Split((a, b), sum(map(abs, charges)) > abs(molecule.charge)))
    return splits


def charge_splits(total: int) -> list[tuple[int, int]]:
    """Return the ways to share a charge: all of one sign, and for a neutral molecule one electron moved."""
    if total == 0:
        return [(0, 0), (1, -1), (-1, 1)]
    sign = 1 if total > 0 else -1
    return [(sign * q, total - sign * q) for q in range(abs(total) + 1)]


def unpaired_options(symbols: Sequence[str], charge: int) -> list[int]:
    """Return the numbers of unpaired electrons worth trying for a fragment by itself.

    For atoms those of its open s or p shell down to pairs (up to six with open d shells), for groups a
    singlet and a triplet, or a doublet and, of few atoms, a quartet (CH and its like have low-lying ones).
    """
    electrons = sum(ELEMENTS[s] for s in symbols) - charge
    if electrons < 0:
        return []
    if len(symbols) > 1:
        small = len(symbols) <= _SMALL_GROUP
        return [0, 2] if electrons % 2 == 0 else [1, 3] if small else [1]
    most = _most_unpaired(ELEMENTS[symbols[0]], electrons)
    return list(range(electrons % 2, most + 1, 2))


def _most_unpaired(nuclear: int, electrons: int) -> int:
    if electrons <= 2:
        return electrons % 2
    shell = next((s for s in _SHELLS if s[0] < electrons <= s[1]), None)
    transition = 20 < nuclear <= 30 or 38 < nuclear <= 48 or nuclear > 56
    if shell is None or transition:
        return min(_MOST_OPEN - electrons % 2, electrons)
    valence = electrons - shell[2]
    return valence % 2 if valence <= 2 else min(valence - 2, 8 - valence)


def _coupled(
    molecule: Molecule, fragments: Sequence[Sequence[int]], charges: tuple[int, int], wanted: int
) -> list[tuple[int, int]]:
    """Return pairs of unpaired electrons whose spins couple to the molecule's.

    Where none of the usual ones do, the molecule's spin is high, and fragments of higher spin are tried.
    """
    known = molecule.symbols
    symbols = [[known[a] for a in f] for f in fragments]
    a, b = (unpaired_options(s, q) for s, q in zip(symbols, charges, strict=True))
    pairs = [(m, n) for m, n in product(a, b) if couples(m, n, wanted)]
    if wanted > 0:  # the spin of a larger group may be high where the molecule's is
        a, b = (
            [*o, 3] if o == [1] and len(s) > _SMALL_GROUP else o for o, s in zip((a, b), symbols, strict=True)
        )
        pairs = [(m, n) for m, n in product(a, b) if couples(m, n, wanted)]
    if not pairs and a and b:
        more = [range(options[0], wanted + 2, 2) for options in (a, b)]
        pairs = [(m, n) for m, n in product(*more) if m + n == wanted]
    return pairs


def couples(a: int, b: int, wanted: int) -> bool:
    """Whether spins of ``a`` and ``b`` unpaired electrons can add up to that of ``wanted`` ones."""
    return abs(a - b) <= wanted <= a + b and (a + b - wanted) % 2 == 0


def _state(
    molecule: Molecule, level: Level, path: ScanPath, which: int, charge: int, unpaired: int
) -> FragmentState:
    atoms, known = list(path.fragments[which]), molecule.symbols
    symbols = [known[a] for a in atoms]
    twins = len(known) == 2 and known[0] == known[1]
    place = 0 if twins else which  # two equal atoms have equal shares of an active space
    facts = {"symbols": symbols, "charge": charge, "multiplicity": unpaired + 1}
    positions = _by_itself(path.positions[-1][atoms])
    spec = fragment_spec(level, symbols, unpaired)
    work = {
        "kind": "fragment",
        "molecule": facts,
        "positions": positions.tolist(),
        "spec": spec,
        "correlation": level.correlation,
        "frozen_core": level.correlates_valence_only,
        "which": place,
        "fragments": [list(f) for f in path.fragments],
        "bonds": [],
    }
    whole = _whole(molecule, level, path, place) if level.reference == "CASSCF" else None
    method = [spec, level.correlation, level.correlates_valence_only and level.correlation != "NEVPT2", whole]
    head = canonical([PHYSICS_VERSION, "fragment", facts, method])
    key = digest(head.encode() + geometry_bytes(positions))
    return FragmentState(which, charge, unpaired + 1, key, {"key": key, **work})


def fragment_spec(level: Level, symbols: Sequence[str], unpaired: int) -> dict[str, Any]:
    """Return the reference of a fragment at the molecule's level.

    Restricted references give RHF for closed and ROHF for open shells, Kohn-Sham ones UKS, UHF stays UHF;
    of a CASSCF's active space a fragment has its share, one state of it.
    """
    kind = level.reference
    if kind in RESTRICTED:
        kind = "ROHF" if unpaired else "RHF"
    elif kind in KOHN_SHAM:
        kind = "UKS"
    spec: dict[str, Any] = {
        "reference": kind,
        "functional": level.functional.strip().lower() if level.functional else None,
        "basis": {e: (level.basis_of(e) or "").strip().lower() for e in sorted(set(symbols))},
    }
    return spec | {"states": 1} if kind == "CASSCF" else spec


def _whole(molecule: Molecule, level: Level, path: ScanPath, which: int) -> list[Any]:
    """Return what decides the share of an active space: the molecule, its space and where it breaks."""
    space = level.active_space
    return [
        [list(molecule.symbols), molecule.charge, molecule.multiplicity],
        space if isinstance(space, str) else space.model_dump() if space else None,
        [list(f) for f in path.fragments],
        [list(b) for b in path.bonds],
        which,
    ]


def _by_itself(positions: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return positions relative to the fragment's first atom, so that it is one fragment wherever it lies."""
    return positions - positions[0]
