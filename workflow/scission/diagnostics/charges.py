"""What the density says of the bond itself: bond order and dipole moment.  Shown, never judged."""

from __future__ import annotations

import numpy as np

from scission.solution import Solution
from scission.units import AU_DIPOLE_IN_DEBYE

from .types import Absent

MAYER = "Mayer, Chem. Phys. Lett. 97, 270 (1983); open shells: 117, 396 (1985)"


def mayer(solution: Solution) -> float | Absent:
    """Mayer bond order of the stretched bond, dimensionless; the smallest one of several.

    B = sum over functions a on the one, b on the other atom of (PS)_ab (PS)_ba + (P_s S)_ab (P_s S)_ba, with
    the total density P and the spin density P_s of the reference.  It depends on the basis, and with
    diffuse functions it loses its meaning.  Mayer (1983, 1985).
    """
    if solution.bond_orders is None or not len(solution.bond_orders):
        return Absent("no bond is stretched, or the density was not kept")
    return float(np.min(solution.bond_orders))


def dipole(solution: Solution) -> float | Absent:
    """Magnitude of the reference's dipole moment, debye; of an ion about its centre of nuclear charge."""
    if solution.dipole is None:
        return Absent("the level has no dipole moment")
    return float(np.linalg.norm(solution.dipole)) * AU_DIPOLE_IN_DEBYE
