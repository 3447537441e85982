"""Extended Rydberg curve: Murrell and Sorbie, J. Chem. Soc. Faraday Trans. 2, 70, 1552 (1974).

Parameters for many diatomics: Huxley and Murrell, J. Chem. Soc. Faraday Trans. 2, 79, 323 (1983).
"""

from collections.abc import Mapping

import numpy as np

from scission.curves.curve import FloatArray
from scission.curves.start import best_linear, vertex

PARAMETERS = ("r_e", "depth", "a1", "a2", "a3", "bottom")
POSITIVE = ("r_e", "depth", "a1")


def energy(
    r: FloatArray, r_e: float, depth: float, a1: float, a2: float, a3: float, bottom: float
) -> FloatArray:
    """bottom + depth (1 - (1 + a1 x + a2 x^2 + a3 x^3) exp(-a1 x)), x = r - r_e.

    ``r`` (n,) bohr, ``a_k`` 1/bohr^k, energies hartree.  The linear coefficient equals the
    exponent, so that r_e is the minimum.
    """
    x = r - r_e
    return bottom + depth * (1.0 - (1.0 + x * (a1 + x * (a2 + x * a3))) * np.exp(-a1 * x))


def guess(r: FloatArray, e: FloatArray) -> dict[str, float]:
    """Start values from a curve with a minimum: for each trial ``a1`` the rest is linear."""
    r_e = vertex(r, e)
    x = r - r_e

    def columns(a1: float) -> FloatArray:
        decay = np.exp(-a1 * x)
        return np.column_stack([np.ones_like(x), (1.0 + a1 * x) * decay, x**2 * decay, x**3 * decay])

    a1, c = best_linear(columns, e, np.geomspace(0.2, 8.0, 80), lambda c: c[1] < 0.0)
    return {
        "r_e": r_e,
        "depth": float(-c[1]),
        "a1": a1,
        "a2": float(c[2] / c[1]),
        "a3": float(c[3] / c[1]),
        "bottom": float(c[0] + c[1]),
    }


def derivatives(parameters: Mapping[str, float]) -> tuple[float, float, float]:
    """Second to fourth derivative of the energy at r_e, from the Taylor series of the product."""
    depth, a1, a2, a3 = (parameters[name] for name in ("depth", "a1", "a2", "a3"))
    c2 = a2 - a1**2 / 2.0
    c3 = a3 - a1 * a2 + a1**3 / 3.0
    c4 = -a1 * a3 + a1**2 * a2 / 2.0 - a1**4 / 8.0
    return -2.0 * depth * c2, -6.0 * depth * c3, -24.0 * depth * c4
