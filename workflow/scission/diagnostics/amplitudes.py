"""Diagnostics from coupled-cluster amplitudes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from scission.solution import Solution

from .types import Absent

LEE_TAYLOR = "Lee and Taylor, Int. J. Quantum Chem. Symp. 23, 199 (1989)"
JANSSEN_NIELSEN = "Janssen and Nielsen, Chem. Phys. Lett. 290, 423 (1998)"
NIELSEN_JANSSEN = "Nielsen and Janssen, Chem. Phys. Lett. 310, 568 (1999)"

_NO_AMPLITUDES = Absent("the level has no coupled-cluster amplitudes")
_NOT_CONVERGED = Absent("the coupled-cluster amplitudes did not converge")
_CONTAMINATED = Absent("the reference is spin contaminated: its amplitudes also repair the spin")
_CLOSED_SHELL_ONLY = Absent("defined for a closed-shell reference with equal orbitals of both spins")
_CONTAMINATION = 0.1


def t1(solution: Solution) -> float | Absent:
    """Norm of the singles amplitudes per correlated electron, dimensionless.

    ||t1|| / sqrt(N), t1 of shape (n_occ, n_vir), N correlated electrons.  With different orbitals for
    different spins the two blocks are averaged, sqrt((||ta||^2 + ||tb||^2) / 2N), which is the same number
    when they are equal.  Lee and Taylor, Int. J. Quantum Chem. Symp. 23, 199 (1989).
    """
    problem = _problem(solution)
    if problem:
        return problem
    assert solution.t1 is not None
    squares = sum(float(np.sum(t * t)) for t in solution.t1) / len(solution.t1)
    return float(np.sqrt(squares / (solution.n_correlated or 1)))


def d1(solution: Solution) -> float | Absent:
    """Largest singular value of the singles amplitudes (n_occ, n_vir), dimensionless, closed shells.

    Janssen and Nielsen, Chem. Phys. Lett. 290, 423 (1998).
    """
    problem = _problem(solution)
    if problem:
        return problem
    assert solution.t1 is not None
    if len(solution.t1) > 1:
        return _CLOSED_SHELL_ONLY
    return float(np.linalg.norm(solution.t1[0], 2)) if solution.t1[0].size else 0.0


def d2(solution: Solution) -> float | Absent:
    """Largest singular value of the doubles amplitudes, dimensionless, closed shells.

    t2 (n_occ, n_occ, n_vir, n_vir) is read as a matrix with one occupied, then one virtual index against
    the other three; the larger of both counts.  Nielsen and Janssen, Chem. Phys. Lett. 310, 568 (1999).
    """
    problem = _problem(solution)
    if problem:
        return problem
    assert solution.t2 is not None
    if len(solution.t2) > 1:
        return _CLOSED_SHELL_ONLY
    t2 = solution.t2[0]
    return max(_largest_singular_value(t2), _largest_singular_value(t2.transpose(2, 3, 0, 1)))


def largest_t2(solution: Solution) -> float | Absent:
    """Largest absolute doubles amplitude, dimensionless.  Common practice, no source."""
    problem = _problem(solution)
    if problem:
        return problem
    assert solution.t2 is not None
    return max((float(np.abs(block).max()) for block in solution.t2 if block.size), default=0.0)


def triples_share(solution: Solution) -> float | Absent:
    """Share of the perturbative triples in the correlation energy, percent.  Common practice, no source."""
    triples = solution.energies.get("triples")
    total = solution.energies.get("correlation")
    if triples is None or not total:
        return Absent("the level has no perturbative triples")
    if not solution.converged:
        return _NOT_CONVERGED
    if (solution.n_correlated or 0) < 3:
        return Absent("fewer than three correlated electrons have no triples")
    return 100.0 * triples / total


def _problem(solution: Solution) -> Absent | None:
    if solution.t1 is None or solution.t2 is None:
        return _NO_AMPLITUDES
    if not solution.converged:
        return _NOT_CONVERGED
    expected = solution.spin * (solution.spin + 1.0)
    if solution.s2 is not None and solution.s2 - expected > _CONTAMINATION:
        return _CONTAMINATED
    return None


def _largest_singular_value(t: NDArray[np.float64]) -> float:
    matrix = t.reshape(t.shape[0], -1)
    return float(np.sqrt(np.linalg.eigvalsh(matrix @ matrix.T)[-1].clip(0.0))) if matrix.size else 0.0
