"""From the shape of a minimum to spectroscopic constants, with standard errors.

Dunham, Phys. Rev. 41, 721 (1932): with xi = (r - r_e)/r_e the curve is written
V = a0 xi^2 (1 + a1 xi + a2 xi^2 + ...); to leading order in B_e/omega_e

    omega_e = sqrt(f2/mu),  B_e = 1/(2 mu r_e^2),
    alpha_e = -6 B_e^2 (1 + a1)/omega_e,  omega_e x_e = (3/2) B_e (5/4 a1^2 - a2),

where a1 = f3 r_e/(3 f2), a2 = f4 r_e^2/(12 f2) and f2, f3, f4 are the derivatives of the energy
at r_e.  For a Morse curve these are the exact omega_e x_e = a^2/(2 mu) and Pekeris's alpha_e.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from scission.curves.curve import FitRow, FloatArray
from scission.units import (
    BOHR_IN_ANGSTROM,
    DALTON_IN_ELECTRON_MASS,
    HARTREE_IN_EV,
    HARTREE_IN_PER_CM,
    HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE,
)

UNITS = {
    "r_e": "angstrom",
    "D_e": "eV",
    "D_e_coverage": "1",
    "k_e": "N/m",
    "omega_e": "cm^-1",
    "omega_e_x_e": "cm^-1",
    "B_e": "cm^-1",
    "alpha_e": "cm^-1",
    "omega_stretch": "cm^-1",
    "reduced_mass": "dalton",
    "rms_residual": "cm^-1",
    "max_residual": "cm^-1",
    "points_used": "1",
    "flagged_points_used": "1",
    "criterion": "1",
    "residual_deviation": "cm^-1",
}

STEP = 0.1


@dataclass(frozen=True)
class Well:
    """A minimum: ``r_e`` (bohr), ``bottom`` and ``depth`` (hartree), f2 to f4 (hartree/bohr^k)."""

    r_e: float
    bottom: float
    f2: float
    f3: float
    f4: float
    depth: float | None = None


def constants(well: Well, reduced_mass: float | None, diatomic: bool) -> dict[str, float]:
    """The quantities that a well gives, in the units of ``UNITS``; ``f2`` must be positive.

    A polyatomic stretch has no rotational constant of its own and no omega_e: with a reduced
    mass it gets ``omega_stretch``, the harmonic wavenumber of two rigid fragments.
    """
    values = {
        "r_e": well.r_e * BOHR_IN_ANGSTROM,
        "k_e": well.f2 * HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE,
    }
    if well.depth is not None:
        values["D_e"] = well.depth * HARTREE_IN_EV
    if reduced_mass is None:
        return values
    return values | (_dunham(well, reduced_mass) if diatomic else _stretch(well, reduced_mass))


def _dunham(well: Well, mass: float) -> dict[str, float]:
    omega = np.sqrt(well.f2 / mass)
    b = 1.0 / (2.0 * mass * well.r_e**2)
    a1 = well.f3 * well.r_e / (3.0 * well.f2)
    a2 = well.f4 * well.r_e**2 / (12.0 * well.f2)
    atomic = {
        "omega_e": omega,
        "omega_e_x_e": 1.5 * b * (1.25 * a1**2 - a2),
        "B_e": b,
        "alpha_e": -6.0 * b**2 * (1.0 + a1) / omega,
    }
    return {name: float(value * HARTREE_IN_PER_CM) for name, value in atomic.items()}


def _stretch(well: Well, mass: float) -> dict[str, float]:
    return {
        "omega_stretch": float(np.sqrt(well.f2 / mass) * HARTREE_IN_PER_CM),
        "reduced_mass": mass / DALTON_IN_ELECTRON_MASS,
    }


def propagate(
    quantities: Callable[[FloatArray], dict[str, float]], values: FloatArray, covariance: FloatArray
) -> dict[str, float]:
    """Standard errors of derived quantities, to first order in the covariance (k, k) of ``values`` (k,).

    Central differences are taken along the principal axes of the correlation matrix, a tenth of a
    standard deviation each way: no step sizes to choose for parameters of different scale.
    """
    sigma = np.sqrt(np.diag(covariance))
    scale = np.where(sigma > 0.0, sigma, 1.0)
    variances, axes = np.linalg.eigh(covariance / np.outer(scale, scale))
    total: dict[str, float] = dict.fromkeys(quantities(values), 0.0)
    for variance, axis in zip(variances, axes.T, strict=True):
        step = STEP * np.sqrt(max(float(variance), 0.0)) * axis * scale
        plus, minus = quantities(values + step), quantities(values - step)
        for name in total:
            total[name] += ((plus[name] - minus[name]) / (2.0 * STEP)) ** 2
    return {name: float(np.sqrt(value)) for name, value in total.items()}


def rows(model: str, values: dict[str, float], errors: dict[str, float]) -> list[FitRow]:
    """Rows of a model in the order of ``UNITS``; a quantity without an error gets NaN."""
    return [
        FitRow(model, name, float(values[name]), float(errors.get(name, np.nan)), UNITS[name])
        for name in UNITS
        if name in values
    ]


def quality(residual: FloatArray, flagged: Sequence[bool]) -> dict[str, float]:
    """How well a model fits the points it used: ``residual`` (m,) hartree, ``flagged`` (m)."""
    return {
        "rms_residual": float(np.sqrt(np.mean(residual**2)) * HARTREE_IN_PER_CM),
        "max_residual": float(np.max(np.abs(residual)) * HARTREE_IN_PER_CM),
        "points_used": float(residual.size),
        "flagged_points_used": float(sum(flagged)),
    }
