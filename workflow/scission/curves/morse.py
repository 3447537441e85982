"""Morse curve: Morse, Phys. Rev. 34, 57 (1929)."""

from collections.abc import Mapping

import numpy as np

from scission.curves.curve import FloatArray
from scission.curves.start import best_linear, vertex

PARAMETERS = ("r_e", "depth", "a", "bottom")
POSITIVE = ("r_e", "depth", "a")


def energy(r: FloatArray, r_e: float, depth: float, a: float, bottom: float) -> FloatArray:
    """bottom + depth (1 - exp(-a (r - r_e)))^2; ``r`` (n,) bohr, ``a`` 1/bohr, energies hartree."""
    return bottom + depth * (1.0 - np.exp(-a * (r - r_e))) ** 2


def guess(r: FloatArray, e: FloatArray) -> dict[str, float]:
    """Start values from a curve with a minimum: for each trial ``a`` the rest is linear."""
    r_e = vertex(r, e)

    def columns(a: float) -> FloatArray:
        return np.column_stack([np.ones_like(r), (1.0 - np.exp(-a * (r - r_e))) ** 2])

    a, (bottom, depth) = best_linear(columns, e, np.geomspace(0.1, 5.0, 80), lambda c: c[1] > 0.0)
    return {"r_e": r_e, "depth": float(depth), "a": a, "bottom": float(bottom)}


def derivatives(parameters: Mapping[str, float]) -> tuple[float, float, float]:
    """Second to fourth derivative of the energy at r_e: 2 D a^2, -6 D a^3, 14 D a^4."""
    depth, a = parameters["depth"], parameters["a"]
    return 2.0 * depth * a**2, -6.0 * depth * a**3, 14.0 * depth * a**4
