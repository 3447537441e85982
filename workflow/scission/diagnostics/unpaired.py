"""Effectively unpaired electrons and their relatives: from the spectrum of a one-particle density alone."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from scission.solution import Solution

from .types import Absent

TAKATSUKA = (
    "Takatsuka, Fueno and Yamaguchi, Theor. Chim. Acta 48, 175 (1978); "
    "Staroverov and Davidson, Chem. Phys. Lett. 330, 161 (2000)"
)
HEAD_GORDON = "Head-Gordon, Chem. Phys. Lett. 372, 508 (2003); 380, 488 (2003)"
TISHCHENKO = "Tishchenko, Zheng and Truhlar, J. Chem. Theory Comput. 4, 1208 (2008)"
YAMAGUCHI = "Yamaguchi, Chem. Phys. Lett. 33, 330 (1975)"
RAMOS_CORDOBA = "Ramos-Cordoba, Salvador and Matito, Phys. Chem. Chem. Phys. 18, 24015 (2016)"

_NO_OCCUPATIONS = Absent("the level has no natural occupations")
_ONE_DETERMINANT = Absent("the level is one determinant or has no spin-resolved density of its own")
_NO_ACTIVE_SPACE = Absent("the level has no active space or full configuration interaction")


def n_d(solution: Solution) -> float | Absent:
    """Odd electrons N_D = sum_i n_i (2 - n_i), electrons; n_i (n,) spin-summed natural occupations.

    The trace of 2P - PSP.  The 2S electrons of an open shell count in full; two for a broken single bond.
    Takatsuka, Fueno and Yamaguchi (1978); Staroverov and Davidson (2000).
    """
    n = _occupations(solution)
    return n if isinstance(n, Absent) else float(np.sum(n * (2.0 - n)))


def n_u(solution: Solution) -> float | Absent:
    """Effectively unpaired electrons N_U = sum_i min(n_i, 2 - n_i), electrons.

    Head-Gordon, Chem. Phys. Lett. 372, 508 (2003).
    """
    n = _occupations(solution)
    return n if isinstance(n, Absent) else float(np.sum(np.minimum(n, 2.0 - n)))


def n_u_squared(solution: Solution) -> float | Absent:
    """Effectively unpaired electrons, second form: N_U = sum_i n_i^2 (2 - n_i)^2, electrons.

    Small occupations, which dynamic correlation makes, hardly count.
    Head-Gordon, Chem. Phys. Lett. 380, 488 (2003).
    """
    n = _occupations(solution)
    return n if isinstance(n, Absent) else float(np.sum((n * (2.0 - n)) ** 2))


def m_diagnostic(solution: Solution) -> float | Absent:
    """M = (2 - n_a + n_b + sum over singly occupied |n - 1|) / 2, dimensionless.

    n_a is the smallest occupation among the doubly occupied natural orbitals, n_b the largest among the
    empty ones; as many orbitals as the spin asks for count as singly occupied.  For active spaces.
    Tishchenko, Zheng and Truhlar, J. Chem. Theory Comput. 4, 1208 (2008).
    """
    if not _correlated(solution):
        return _NO_ACTIVE_SPACE
    n = _occupations(solution)
    if isinstance(n, Absent):
        return n
    n_alpha, n_beta = (e - solution.n_inactive for e in solution.n_electrons)
    if not (n_beta > 0 and n_alpha < n.size):
        return Absent("the space holds no doubly occupied or no empty orbital")
    single = np.abs(n[n_beta:n_alpha] - 1.0).sum()
    return float(2.0 - n[n_beta - 1] + n[n_alpha] + single) / 2.0


def y(solution: Solution) -> float | Absent:
    """Diradical character y = 1 - 2T / (1 + T^2), T = (n_HONO - n_LUNO) / 2, dimensionless, 0 to 1.

    Singlets: from the natural occupations of the unrestricted determinant, whose overlap of the breaking
    pair T is, or of the active space.  Yamaguchi (1975).
    """
    if solution.open_shell:
        return Absent("defined for singlets")
    n = _occupations(solution)
    if isinstance(n, Absent):
        return n
    inactive = solution.n_inactive if _correlated(solution) else 0
    pair = solution.n_electrons[1] - inactive
    if not 0 < pair < n.size:
        return Absent("the space holds no such pair of orbitals")
    t = (n[pair - 1] - n[pair]) / 2.0
    return float(1.0 - 2.0 * t / (1.0 + t * t))


def i_nd(solution: Solution) -> float | Absent:
    """Nondynamic correlation I_ND = 1/2 sum over spin orbitals n (1 - n), electrons.

    n (2, m) are the natural occupations of the alpha and of the beta density.  H2 far apart: 1/2.
    Ramos-Cordoba, Salvador and Matito (2016).
    """
    n = _spin_occupations(solution)
    return n if isinstance(n, Absent) else float(0.5 * np.sum(n * (1.0 - n)))


def i_d(solution: Solution) -> float | Absent:
    """Dynamic correlation I_D = 1/4 sum over spin orbitals [ sqrt(n (1 - n)) - 2 n (1 - n) ], electrons.

    Only what the active space holds of it.  Ramos-Cordoba, Salvador and Matito (2016).
    """
    n = _spin_occupations(solution)
    if isinstance(n, Absent):
        return n
    fluctuation = n * (1.0 - n)
    return float(0.25 * np.sum(np.sqrt(fluctuation) - 2.0 * fluctuation))


def _correlated(solution: Solution) -> bool:
    return solution.reference == "CASSCF" or solution.correlation == "FCI"


def _occupations(solution: Solution) -> NDArray[np.float64] | Absent:
    """Natural occupations, rounding errors beyond 0 and 2 cut off."""
    known = solution.natural_occupations
    return _NO_OCCUPATIONS if known is None else np.clip(known, 0.0, 2.0)


def _spin_occupations(solution: Solution) -> NDArray[np.float64] | Absent:
    known = solution.spin_occupations
    return _ONE_DETERMINANT if known is None else np.clip(known, 0.0, 1.0)
