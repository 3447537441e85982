"""Diagnostics from the spin of the reference determinant."""

from __future__ import annotations

from scission.solution import Solution

from .types import Absent

SEEGER_POPLE = "Seeger and Pople, J. Chem. Phys. 66, 3045 (1977)"

_UNKNOWN = Absent("the level has no spin expectation value")


def s2(solution: Solution) -> float | Absent:
    """Expectation value of the total spin squared of the reference, dimensionless (units of hbar^2)."""
    return _UNKNOWN if solution.s2 is None else solution.s2


def s2_excess(solution: Solution) -> float | Absent:
    """<S^2> - S(S+1) with S of the state that was asked for, dimensionless.

    Of unrestricted determinants; every other wavefunction here has its spin by its form.
    """
    if solution.reference not in ("UHF", "UKS") or solution.correlation == "FCI":
        return Absent("the wavefunction has the spin asked for by its form")
    return _UNKNOWN if solution.s2 is None else solution.s2 - solution.spin * (solution.spin + 1.0)


def triplet_stability(solution: Solution) -> float | Absent:
    """Lowest eigenvalue of the restricted determinant's triplet stability matrix, hartree.

    Negative: an unrestricted solution lies lower.  Seeger and Pople, J. Chem. Phys. 66, 3045 (1977).
    """
    if solution.triplet_stability is None:
        return Absent("defined for a restricted closed-shell determinant")
    return solution.triplet_stability
