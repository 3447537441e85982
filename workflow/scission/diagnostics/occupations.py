"""Diagnostics from natural occupations: of unrestricted determinants and of active spaces."""

from __future__ import annotations

from scission.solution import Solution

from .types import Absent

PULAY_HAMILTON = "Pulay and Hamilton, J. Chem. Phys. 88, 4926 (1988)"
CORRELATED = ("CASSCF",)


def uhf_hono(solution: Solution) -> float | Absent:
    """Occupation of the last strongly occupied natural orbital of an unrestricted determinant, electrons.

    Orbital number n_beta, counted from 1 in decreasing occupation.
    Pulay and Hamilton, J. Chem. Phys. 88, 4926 (1988).
    """
    return _frontier(solution, unrestricted=True, occupied=True)


def uhf_luno(solution: Solution) -> float | Absent:
    """Occupation of the first weakly occupied natural orbital of an unrestricted determinant, electrons.

    Orbital number n_alpha + 1.  Pulay and Hamilton, J. Chem. Phys. 88, 4926 (1988).
    """
    return _frontier(solution, unrestricted=True, occupied=False)


def hono(solution: Solution) -> float | Absent:
    """Occupation of the last strongly occupied natural orbital of the active space, electrons."""
    return _frontier(solution, unrestricted=False, occupied=True)


def luno(solution: Solution) -> float | Absent:
    """Occupation of the first weakly occupied natural orbital of the active space, electrons."""
    return _frontier(solution, unrestricted=False, occupied=False)


def c0_squared(solution: Solution) -> float | Absent:
    """Squared weight of the leading configuration in natural orbitals, dimensionless, 0 to 1."""
    if solution.leading_weight is None:
        return Absent("the level has no configuration expansion")
    return solution.leading_weight


def _frontier(solution: Solution, unrestricted: bool, occupied: bool) -> float | Absent:
    if unrestricted and (solution.reference not in ("UHF", "UKS") or solution.correlation == "FCI"):
        return Absent("defined for an unrestricted determinant")
    if not unrestricted and not has_active_space(solution):
        return Absent("the level has no active space or full configuration interaction")
    occupations = solution.natural_occupations
    if occupations is None:
        return Absent("the level has no natural occupations")
    inactive = 0 if unrestricted else solution.n_inactive
    n_alpha, n_beta = (n - inactive for n in solution.n_electrons)
    index = n_beta - 1 if occupied else n_alpha
    if not 0 <= index < len(occupations):
        return Absent("the space holds no such orbital")
    return float(occupations[index])


def has_active_space(solution: Solution) -> bool:
    """Whether natural occupations are those of an active space or of full configuration interaction."""
    return solution.reference in CORRELATED or solution.correlation == "FCI"
