"""What a calculation is expected to cost, from its size alone.

Seconds on one thread, by the scaling of each method with basis functions n, correlated pairs o, virtual orbitals
v, atoms and active orbitals.  Constants were fitted to 250 calculations of H2O, OH, N2, F2, CH3OH and C2H6 in
cc-pVDZ and cc-pVTZ (19 to 60 functions) on one core; a factor of two either way is normal between molecules and
processors, so every budget made from them leaves ample room.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import comb
from typing import Any

from scission.campaign import basis_on
from scission.campaign.names import ELEMENTS

MARGIN = 6.0
"""How many times its forecast a calculation may take before it is stopped."""

SHORTEST_BUDGET_S = 600.0

_DETERMINANT = {
    "RHF": 4e-8,
    "ROHF": 5e-8,
    "UHF": 8e-8,
    "CASSCF": 2.5e-7,
    "PAIR": 6e-8,
    "ORBITAL": 6e-8,
    "PAIR+IONIC": 6e-8,
}
"""Reference -> seconds / n^4, carried from a neighbour, instabilities followed, diagnostics included."""

_KOHN_SHAM = {"RKS": 4e-4, "UKS": 8e-4}
"""Reference -> seconds / (atoms x n^2): the grid is most of it."""

_PAIRS = 8e-9
"""CCSD: seconds / (o^2 v^4)."""
_TRIPLES = 7e-10
"""(T): seconds / (o^3 v^4)."""
_TRANSFORM = 5e-10
"""Integrals over orbitals, of a kind that CCSD needs: seconds / n^5."""
_SECOND_ORDER = 3.3e-9
"""MP2: seconds / (o n^4)."""
_VALENCE = 2.5e-8, 1.2e-7
"""NEVPT2: seconds / n^4 and seconds / (active orbitals)^8, for density matrices of four electrons."""
_UNRESTRICTED_FACTOR = 4.0
_EXTRA_START_S = 1.5
_DETERMINANTS_PER_SECOND = 4.0e4
_BASE_MEMORY_MB = 500.0
_KEPT_MB = 320.0
"""Integrals and amplitudes of earlier geometries that a process keeps (:mod:`scission.chemistry.integrals`)."""
_SHORTEST_S = 0.05
_UNKNOWN_SPACE = 6
"""Active orbitals of a space that is not chosen yet."""

_CORES = ((4, 0), (12, 1), (30, 5), (38, 9), (48, 14), (70, 18), (80, 23))
"""Nuclear charge up to which an atom keeps so many doubly occupied core orbitals frozen."""


@dataclass(frozen=True)
class Size:
    """Basis functions, correlated pairs (half the electrons), virtual orbitals, atoms."""

    n: int
    o: float
    v: float
    atoms: int


def size_of(molecule: dict[str, Any], spec: dict[str, Any], frozen_core: bool = False) -> Size:
    """Return what the cost of a calculation depends on."""
    n = n_functions(molecule, spec)
    charges = [ELEMENTS[s] for s in molecule["symbols"]]
    pairs = (sum(charges) - molecule["charge"]) / 2.0
    core = sum(next((c for z, c in _CORES if charge <= z), 34) for charge in charges)
    return Size(n, max(pairs - (core if frozen_core else 0), 0.5), max(n - pairs, 1.0), len(charges))


def n_functions(molecule: dict[str, Any], spec: dict[str, Any]) -> int:
    """Return the number of basis functions of a molecule."""
    sizes = [basis_on(spec["basis"][s], s) for s in molecule["symbols"]]
    return sum(size.functions for size in sizes if size is not None)


def reference_seconds(molecule: dict[str, Any], spec: dict[str, Any]) -> float:
    """Return the expected seconds of one reference of a chain."""
    size, kind = size_of(molecule, spec), spec["reference"]
    if kind in _KOHN_SHAM:
        return max(_KOHN_SHAM[kind] * size.atoms * size.n**2, _SHORTEST_S)
    seconds = _DETERMINANT[kind] * size.n**4
    space = spec.get("active_space")
    if isinstance(space, dict):
        half = space["electrons"] // 2
        seconds += 10 * comb(space["orbitals"], half) ** 2 / _DETERMINANTS_PER_SECOND
    return max(seconds * spec.get("states", 1), _SHORTEST_S)


def correlate_seconds(work: dict[str, Any]) -> float:
    """Return the expected seconds of one point's correlation, beyond what the smallest molecule takes."""
    size = size_of(work["molecule"], work["spec"], work["frozen_core"])
    if "price" in work:  # an extra calculation: in units of RHF with CCSD and (T)
        whole = _DETERMINANT["RHF"] * size.n**4 + _coupled_cluster(size) + _triples(size)
        return float(work["price"]) * (_EXTRA_START_S + whole)
    seconds = {
        "none": 0.0,
        "MP2": _SECOND_ORDER * size.o * size.n**4,
        "CCSD": _coupled_cluster(size),
        "CCSD(T)": _coupled_cluster(size) + _triples(size),
        "FCI": _TRANSFORM * size.n**5,
        "NEVPT2": _VALENCE[0] * size.n**4 + _VALENCE[1] * _active_orbitals(work["spec"]) ** 8,
    }[work["correlation"]]
    if work["spec"]["reference"] in ("UHF", "UKS", "ROHF"):
        seconds *= _UNRESTRICTED_FACTOR
    if work["correlation"] == "FCI":
        seconds += determinants(work) / _DETERMINANTS_PER_SECOND * 10
    return max(seconds * work["spec"].get("states", 1), _SHORTEST_S)


def _coupled_cluster(size: Size) -> float:
    return _PAIRS * size.o**2 * size.v**4 + _TRANSFORM * size.n**5


def _triples(size: Size) -> float:
    return _TRIPLES * size.o**3 * size.v**4


def _active_orbitals(spec: dict[str, Any]) -> int:
    space = spec.get("active_space")
    return int(space["orbitals"]) if isinstance(space, dict) and "orbitals" in space else _UNKNOWN_SPACE


def fragment_seconds(work: dict[str, Any]) -> float:
    """Return the expected seconds of one fragment: its reference from several starts, and its correlation."""
    return 3.0 * reference_seconds(work["molecule"], work["spec"]) + correlate_seconds(work)


def reference_memory_mb(molecule: dict[str, Any], spec: dict[str, Any]) -> float:
    """Return the memory to ask for a chain of references, MB: integrals in memory and room for the engine."""
    n = n_functions(molecule, spec)
    return _BASE_MEMORY_MB + _KEPT_MB + 2.5 * n**4 / 8 * 8 / 1e6


def correlate_memory_mb(work: dict[str, Any]) -> float:
    """Return the memory to ask for a point's correlation, MB."""
    n = n_functions(work["molecule"], work["spec"])
    unrestricted = work["spec"]["reference"] in ("UHF", "UKS", "ROHF")
    memory = _BASE_MEMORY_MB + _KEPT_MB + (6.0 if unrestricted else 2.5) * n**4 / 4 * 8 / 1e6
    if work["correlation"] == "FCI":
        memory += 20 * determinants(work) * 8 / 1e6
    return memory


def budget_seconds(expected: float) -> float:
    """Return the wall time after which a calculation is stopped."""
    return max(SHORTEST_BUDGET_S, MARGIN * expected)


def determinants(work: dict[str, Any]) -> int:
    """Return the number of determinants of a point's full configuration interaction, an upper estimate."""
    molecule = work["molecule"]
    n = n_functions(molecule, work["spec"])
    electrons = sum(ELEMENTS[s] for s in molecule["symbols"]) - molecule["charge"]
    alpha = (electrons + molecule["multiplicity"] - 1) // 2
    return comb(n, alpha) * comb(n, electrons - alpha)
