"""What a calculation is expected to cost, from its size alone.

Seconds = constant x basis functions^power (x determinants for configuration expansions), one thread.  The
constants were measured on one core with molecules of 10 to 120 basis functions; a factor of three either
way is normal between processors and molecules, so every budget made from them leaves ample room.
"""

from __future__ import annotations

from math import comb
from typing import Any

from scission.campaign import basis_on

MARGIN = 6.0
"""How many times its forecast a calculation may take before it is stopped."""

SHORTEST_BUDGET_S = 600.0

_REFERENCE = {
    "RHF": (0.15, 3.0),
    "ROHF": (0.2, 3.0),
    "RKS": (0.8, 2.2),
    "UHF": (0.6, 3.0),
    "UKS": (2.5, 2.2),
    "CASSCF": (1.5, 3.5),
    "PAIR": (0.05, 3.0),
    "ORBITAL": (0.05, 3.0),
    "PAIR+IONIC": (0.05, 3.0),
}
"""Reference -> (seconds at 30 basis functions, power), carried from a neighbour, instabilities followed."""

_CORRELATION = {
    "none": (0.001, 0.0),
    "MP2": (0.1, 3.5),
    "CCSD": (0.8, 4.5),
    "CCSD(T)": (1.0, 5.0),
    "FCI": (0.3, 2.0),
    "NEVPT2": (1.0, 3.5),
}
_UNRESTRICTED_FACTOR = 3.0
_EXTRA_START_S = 1.5
_DETERMINANTS_PER_SECOND = 4.0e4
_BASE_MEMORY_MB = 500.0


def n_functions(molecule: dict[str, Any], spec: dict[str, Any]) -> int:
    """Return the number of basis functions of a molecule."""
    sizes = [basis_on(spec["basis"][s], s) for s in molecule["symbols"]]
    return sum(size.functions for size in sizes if size is not None)


def reference_seconds(molecule: dict[str, Any], spec: dict[str, Any]) -> float:
    """Return the expected seconds of one reference of a chain."""
    at_30, power = _REFERENCE[spec["reference"]]
    seconds = at_30 * (n_functions(molecule, spec) / 30.0) ** power
    space = spec.get("active_space")
    if isinstance(space, dict):
        half = space["electrons"] // 2
        seconds += 10 * comb(space["orbitals"], half) ** 2 / _DETERMINANTS_PER_SECOND
    return max(seconds * spec.get("states", 1), 0.05)


def correlate_seconds(work: dict[str, Any]) -> float:
    """Return the expected seconds of one point's correlation, with the engine's fixed costs."""
    n = n_functions(work["molecule"], work["spec"])
    if "price" in work:  # an extra calculation: in units of RHF with CCSD and (T)
        at_30, power = _CORRELATION["CCSD(T)"]
        return float(work["price"]) * (_EXTRA_START_S + at_30 * (n / 30.0) ** power)
    at_30, power = _CORRELATION[work["correlation"]]
    seconds = at_30 * (n / 30.0) ** power
    if work["spec"]["reference"] in ("UHF", "UKS", "ROHF"):
        seconds *= _UNRESTRICTED_FACTOR
    if work["correlation"] == "FCI":
        seconds += determinants(work) / _DETERMINANTS_PER_SECOND * 10
    return max(seconds, 0.05)


def fragment_seconds(work: dict[str, Any]) -> float:
    """Return the expected seconds of one fragment: its reference from several starts, and its correlation."""
    return 3.0 * reference_seconds(work["molecule"], work["spec"]) + correlate_seconds(work)


def reference_memory_mb(molecule: dict[str, Any], spec: dict[str, Any]) -> float:
    """Return the memory to ask for a chain of references, MB: integrals in memory and room for the engine."""
    n = n_functions(molecule, spec)
    return _BASE_MEMORY_MB + 2.5 * n**4 / 8 * 8 / 1e6


def correlate_memory_mb(work: dict[str, Any]) -> float:
    """Return the memory to ask for a point's correlation, MB."""
    n = n_functions(work["molecule"], work["spec"])
    unrestricted = work["spec"]["reference"] in ("UHF", "UKS", "ROHF")
    memory = _BASE_MEMORY_MB + (6.0 if unrestricted else 2.5) * n**4 / 4 * 8 / 1e6
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
    from scission.campaign.names import ELEMENTS

    electrons = sum(ELEMENTS[s] for s in molecule["symbols"]) - molecule["charge"]
    alpha = (electrons + molecule["multiplicity"] - 1) // 2
    return comb(n, alpha) * comb(n, electrons - alpha)
