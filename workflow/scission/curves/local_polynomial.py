"""A polynomial about the minimum: the model that spectroscopic constants are best read from.

Window: the narrowest of ``HALF_WIDTHS`` (relative to r_e) that holds ``GOOD_NUMBER`` points, three on
each side; failing that, the widest one.  Variable: z = 2 (r - r_e)/(r + r_e), Ogilvie, Proc. R. Soc.
London A 378, 287 (1981), which stays between -2 and 2 for all lengths, so that wide windows on coarse
grids still converge.  Degree: of 4 to 8, as far as the points allow with one to spare, the lowest
whose generalised cross-validation score sqrt(n chi2)/(n - k) is within a fifth of the smallest of all
(or of ``NOISE``); Golub, Heath and Wahba, Technometrics 21, 215 (1979).
Standard errors: the covariance of the fit, widened by Student's factor for the few degrees of
freedom, and, added in quadrature, the model error, taken as the
change of the quantity on going to the neighbouring degree (the lower one; from the lowest, the higher).
On smooth curves that is the larger part by far, and a cautious one.
"""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from scipy.stats import t as student_t

from scission.curves.constants import Well, constants, propagate, quality, rows
from scission.curves.curve import FITTED, Curve, FloatArray, IntArray, ModelFit, not_fitted, residuals
from scission.curves.selection import Selection, flagged
from scission.curves.start import vertex
from scission.units import BOHR_IN_ANGSTROM, HARTREE_IN_EV, HARTREE_IN_PER_CM

NAME = "local-polynomial"
HALF_WIDTHS = (0.12, 0.16, 0.20, 0.25, 0.30, 0.40)
GOOD_NUMBER = 9
LEAST_NUMBER = 6
LOWEST_DEGREE, HIGHEST_DEGREE = 4, 8
NOISE = 1e-11  # hartree; no better fit is looked for below it: energies of large molecules are rounded there
SAME = 1.2
ONE_SIGMA = 0.5 + 0.6826894921 / 2.0
FAR = 2.5  # in units of r_e: how far out the last point must lie to count as the far limit,
FLAT = 0.01  # and by which part of the depth the last step may still rise


def energy(r: FloatArray, centre: float, **coefficients: float) -> FloatArray:
    """The polynomial at lengths ``r`` (n,) bohr, hartree; parameters as a fit reports them."""
    series = [coefficients[f"c{k}"] for k in range(len(coefficients))]
    return np.asarray(np.polynomial.Polynomial(series)(_z(r, centre)), dtype=float)


@dataclass(frozen=True)
class Expansion:
    """c_0 .. c_d (hartree, lowest first) in z about ``centre`` (bohr), their covariance, residual sigma."""

    centre: float
    coefficients: FloatArray
    covariance: FloatArray
    sigma: float


def expand(r: FloatArray, e: FloatArray, degree: int) -> Expansion:
    """Fit the polynomial and move its centre to its own minimum; r, e (n,), n at least degree + 2.

    Energies should be relative to about their minimum, for precision.
    """
    centre = vertex(r, e)
    for _ in range(8):
        coefficients, covariance = np.polyfit(_z(r, centre), e, degree, cov=True)
        root = _stationary(coefficients[::-1])
        moved = centre * (2.0 + root) / (2.0 - root)
        if not r[0] < moved < r[-1]:
            break
        centre = moved
    coefficients, covariance = np.polyfit(_z(r, centre), e, degree, cov=True)
    residual = e - np.polyval(coefficients, _z(r, centre))
    sigma = float(np.sqrt(np.sum(residual**2) / (r.size - degree - 1)))
    return Expansion(centre, coefficients[::-1], covariance[::-1, ::-1], sigma)


def well(coefficients: FloatArray, centre: float) -> Well:
    """The minimum of an expansion: derivatives by r through the chain rule at its stationary point."""
    root = _stationary(coefficients)
    r = centre * (2.0 + root) / (2.0 - root)
    series = np.polynomial.Polynomial(coefficients)
    p1, p2, p3, p4 = (float(series.deriv(k)(root)) for k in (1, 2, 3, 4))
    s = r + centre
    z1, z2, z3, z4 = 4 * centre / s**2, -8 * centre / s**3, 24 * centre / s**4, -96 * centre / s**5
    f2 = p2 * z1**2 + p1 * z2
    f3 = p3 * z1**3 + 3 * p2 * z1 * z2 + p1 * z3
    f4 = p4 * z1**4 + 6 * p3 * z1**2 * z2 + p2 * (3 * z2**2 + 4 * z1 * z3) + p1 * z4
    return Well(r, float(series(root)), f2, f3, f4)


def _z(r: FloatArray, centre: float) -> FloatArray:
    return 2.0 * (r - centre) / (r + centre)


def _stationary(coefficients: FloatArray) -> float:
    """Newton's root of the derivative, from the centre; z stays within half the variable's range."""
    slope = np.polynomial.Polynomial(coefficients).deriv()
    curvature = slope.deriv()
    z = 0.0
    for _ in range(6):
        bend = float(curvature(z))
        z = float(np.clip(z - float(slope(z)) / bend, -1.0, 1.0)) if bend > 0.0 else z
    return z


def fit_local(curve: Curve, selection: Selection) -> ModelFit:
    """Fit the polynomial to the points about the minimum of a selection."""
    if selection.problem:
        return not_fitted(NAME, selection.problem, selection.why)
    index, half_width = _window(curve, selection.index)
    why = _explain(selection, index, half_width)
    problem = _too_few(curve, index, half_width)
    if problem:
        return not_fitted(NAME, problem, why)
    r, e = curve.r[index], curve.energy[index]
    reference = float(e.min())
    degree = choose_degree(r, e - reference)
    best = expand(r, e - reference, degree)
    shape = well(best.coefficients, best.centre)
    if shape.f2 <= 0.0 or not r[0] < shape.r_e < r[-1]:
        return not_fitted(NAME, "the fitted polynomial has no minimum between the points", why)
    return _assemble(curve, selection, index, why, best, _neighbour(r, e - reference, degree), reference)


def choose_degree(r: FloatArray, e: FloatArray) -> int:
    """The lowest degree with as good a cross-validation score as the best one; r, e (n,), n at least 6."""
    degrees = range(LOWEST_DEGREE, min(HIGHEST_DEGREE, r.size - 2) + 1)
    score = {}
    for degree in degrees:
        sparseness = np.sqrt(r.size / (r.size - degree - 1))
        score[degree] = max(expand(r, e, degree).sigma, NOISE) * sparseness
    good = SAME * min(score.values())
    return next(degree for degree in degrees if score[degree] <= good)


def _neighbour(r: FloatArray, e: FloatArray, degree: int) -> Expansion:
    upward = degree == LOWEST_DEGREE and r.size >= degree + 3
    return expand(r, e, degree + 1 if upward else degree - 1)


def _window(curve: Curve, index: IntArray) -> tuple[IntArray, float]:
    centre = vertex(curve.r[index], curve.energy[index])
    for half_width in HALF_WIDTHS:
        inside = index[np.abs(curve.r[index] / centre - 1.0) <= half_width]
        left = int(np.sum(curve.r[inside] < centre))
        if inside.size >= GOOD_NUMBER and min(left, inside.size - left) >= 3:
            break
    return inside, half_width


def _too_few(curve: Curve, index: IntArray, half_width: float) -> str:
    if index.size < LEAST_NUMBER:
        return (
            f"too few points: a polynomial about the minimum needs {LEAST_NUMBER} within "
            f"{half_width:.0%} of it, there are {index.size}"
        )
    inner = int(np.argmin(curve.energy[index]))
    if min(inner, index.size - 1 - inner) < 2:
        return "too few points: at least 2 are needed on each side of the minimum"
    return ""


def _explain(selection: Selection, index: IntArray, half_width: float) -> list[str]:
    why = list(selection.why)
    for i in np.setdiff1d(selection.index, index):
        why[i] = f"farther than {half_width:.0%} from the minimum"
    return why


def _assemble(
    curve: Curve,
    selection: Selection,
    index: IntArray,
    why: list[str],
    best: Expansion,
    neighbour: Expansion,
    reference: float,
) -> ModelFit:
    limit, limit_error, origin = _limit(curve, selection.index)
    depth_limit = None if limit is None else limit - reference
    evaluate = _quantities(curve, best.centre, depth_limit)
    values = evaluate(best.coefficients)
    widened = best.covariance * student_t.ppf(ONE_SIGMA, index.size - best.coefficients.size) ** 2
    errors = propagate(evaluate, best.coefficients, widened)
    other = _quantities(curve, neighbour.centre, depth_limit)(neighbour.coefficients)
    errors = {key: float(np.hypot(errors[key], values[key] - other[key])) for key in values}
    if "D_e" in values:
        errors["D_e"] = float(np.hypot(errors["D_e"], limit_error * HARTREE_IN_EV))
    message = f"fitted; degree {best.coefficients.size - 1} with {index.size} points; {origin}"
    used = np.isin(np.arange(curve.r.size), index)
    parameters = {"centre": best.centre}
    parameters |= {f"c{k}": float(c) for k, c in enumerate(best.coefficients)}
    parameters["c0"] += reference
    residual = residuals(curve, energy, parameters)
    values |= quality(residual[index], flagged(curve)[index].tolist())
    values["residual_deviation"] = best.sigma * HARTREE_IN_PER_CM
    return ModelFit(NAME, FITTED, message, used, why, residual, tuple(rows(NAME, values, errors)), parameters)


def _quantities(curve: Curve, centre: float, limit: float | None) -> Callable[[FloatArray], dict[str, float]]:
    def evaluate(coefficients: FloatArray) -> dict[str, float]:
        shape = well(coefficients, centre)
        depth = None if limit is None else limit - shape.bottom
        return constants(replace(shape, depth=depth), curve.reduced_mass, curve.diatomic)

    return evaluate


def _limit(curve: Curve, index: IntArray) -> tuple[float | None, float, str]:
    """Energy of the separated fragments, its uncertainty, and words on where it comes from."""
    if curve.fragment_limit is not None and np.isfinite(curve.fragment_limit):
        return float(curve.fragment_limit), 0.0, "D_e from the energies of the separate fragments"
    r, e = curve.r[index], curve.energy[index]
    step = abs(float(e[-1] - e[-2]))
    if r[-1] > FAR * r[int(np.argmin(e))] and step < FLAT * float(e[-1] - e.min()):
        return float(e[-1]), step, f"D_e from the outermost point at {r[-1] * BOHR_IN_ANGSTROM:.2f} angstrom"
    return None, 0.0, "no D_e: the points used do not reach the far limit"
