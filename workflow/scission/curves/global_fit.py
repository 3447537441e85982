"""Fits of the registered curve models with lmfit, over the whole well.

Weights.  The model error of a three- or five-parameter curve grows with the distance from the
minimum, and the constants come from the well.  Each residual is divided by 1 + (E - E_min)/s with
s a fifth of the highest outer energy of the fit: full weight at the bottom, a sixth at the far end.
Standard errors come from the covariance of the fit, scaled by its residuals: they say how
well the points determine the parameters of this model, not how well the model suits the molecule.
Only D_e carries more: the part of it beyond the outermost point counts as error in full.
"""

from collections.abc import Callable, Mapping
from types import ModuleType

import lmfit
import numpy as np

from scission.curves.constants import Well, constants, propagate, quality, rows
from scission.curves.curve import FITTED, Curve, FloatArray, ModelFit, not_fitted, residuals
from scission.curves.selection import Selection, flagged

WEIGHT_SCALE = 0.2
NOISE = 1e-8  # hartree; residuals below the convergence of the energies do not count as a better fit
EXTRA_POINTS = 2
COVERED = 0.95
POOR = 0.01
UNDETERMINED = 0.1
"""A D_e whose standard error is more than this part of it is withheld."""

MAX_EVALUATIONS = 20000


def fit_global(name: str, model: ModuleType, curve: Curve, selection: Selection) -> ModelFit:
    """Fit one registered model to the selected points of a curve."""
    needed = len(model.PARAMETERS) + EXTRA_POINTS
    r, e = curve.r[selection.index], curve.energy[selection.index]
    problem = selection.problem or _too_few(r, e, needed)
    if problem:
        return not_fitted(name, problem, selection.why)
    reference = float(e.min())
    result = _least_squares(model, r, e - reference)
    problem = _unsound(result, r)
    if problem:
        return not_fitted(name, problem, selection.why)
    return _assemble(name, model, curve, selection, result, reference)


def weights(e: FloatArray) -> FloatArray:
    """Weights (m,) of the residuals of energies ``e`` (m,), ordered by length; see the module."""
    rise = e - e.min()
    scale = WEIGHT_SCALE * max(float(rise[int(np.argmin(e)) :].max()), 1e-6)
    return 1.0 / (1.0 + rise / scale)


def aicc(weighted: FloatArray, weight: FloatArray, n_parameters: int) -> float:
    """Akaike's criterion with the small-sample correction; lower is better.

    n ln(chi2/n) + 2k + 2k(k+1)/(n-k-1), with ``weighted`` (n,) residuals in hartree and chi2
    not below that of residuals of ``NOISE``.  Hurvich and Tsai, Biometrika 76, 297 (1989).
    """
    n, k = weighted.size, n_parameters
    chi2 = max(float(np.sum(weighted**2)), NOISE**2 * float(np.sum(weight**2)))
    return n * float(np.log(chi2 / n)) + 2.0 * k + 2.0 * k * (k + 1) / (n - k - 1)


def _too_few(r: FloatArray, e: FloatArray, needed: int) -> str:
    if r.size < needed:
        return f"too few points: the model needs {needed} in one well, there are {r.size}"
    inner = int(np.argmin(e))
    if inner in (0, r.size - 1):
        return "too few points: none is left on one side of the minimum"
    return ""


def _least_squares(model: ModuleType, r: FloatArray, e: FloatArray) -> lmfit.model.ModelResult:
    start = model.guess(r, e)
    function = lmfit.Model(model.energy, independent_vars=["r"], nan_policy="raise")
    parameters = function.make_params(**start)
    for name in model.POSITIVE:
        parameters[name].set(min=0.0, value=max(start[name], 1e-6))
    parameters["r_e"].set(min=float(r[0]), max=float(r[-1]))
    tight = {"ftol": 1e-15, "xtol": 1e-15, "gtol": 1e-15}
    return function.fit(e, parameters, r=r, weights=weights(e), max_nfev=MAX_EVALUATIONS, fit_kws=tight)


def _unsound(result: lmfit.model.ModelResult, r: FloatArray) -> str:
    best = result.best_values
    if not all(np.isfinite(value) for value in best.values()):
        return "the fit ran away: a parameter is not finite"
    if result.covar is None or not np.all(np.isfinite(result.covar)):
        return "the points do not determine the parameters: the fit has no covariance"
    if not r[0] < best["r_e"] < r[-1]:
        return "the minimum of the fitted model lies outside the points"
    return ""


def _quantities(
    model: ModuleType, curve: Curve, names: list[str], reference: float
) -> Callable[[FloatArray], dict[str, float]]:
    def evaluate(values: FloatArray) -> dict[str, float]:
        parameters = dict(zip(names, values.tolist(), strict=True))
        well = _well(model, parameters, reference)
        return constants(well, curve.reduced_mass, curve.diatomic)

    return evaluate


def _well(model: ModuleType, parameters: Mapping[str, float], reference: float) -> Well:
    f2, f3, f4 = model.derivatives(parameters)
    bottom = parameters["bottom"] + reference
    return Well(parameters["r_e"], bottom, f2, f3, f4, parameters["depth"])


def _assemble(
    name: str,
    model: ModuleType,
    curve: Curve,
    selection: Selection,
    result: lmfit.model.ModelResult,
    reference: float,
) -> ModelFit:
    index = selection.index
    names = list(result.var_names)
    best = np.array([result.best_values[key] for key in names])
    parameters = dict(zip(names, best.tolist(), strict=True))
    if _well(model, parameters, reference).f2 <= 0.0:
        return not_fitted(name, "the fitted model has no minimum at its r_e", selection.why)
    evaluate = _quantities(model, curve, names, reference)
    values, errors = evaluate(best), propagate(evaluate, best, np.asarray(result.covar))
    message = _judge_depth(values, errors, curve, parameters, reference, index)
    parameters["bottom"] += reference
    residual = residuals(curve, model.energy, parameters)
    weight = weights(curve.energy[index])
    values |= quality(residual[index], flagged(curve)[index].tolist())
    values["criterion"] = aicc(residual[index] * weight, weight, len(names))
    if float(np.sqrt(np.mean(residual[index] ** 2))) > POOR * parameters["depth"]:
        message += f"; poor: the rms residual is above {POOR:.0%} of the depth"
    used = np.isin(np.arange(curve.r.size), index)
    return ModelFit(
        name, FITTED, message, used, selection.why, residual, tuple(rows(name, values, errors)), parameters
    )


def _judge_depth(
    values: dict[str, float],
    errors: dict[str, float],
    curve: Curve,
    parameters: Mapping[str, float],
    reference: float,
    index: np.ndarray,
) -> str:
    """Say how much of D_e the points cover, and count the part they do not cover as its error.

    The covariance knows nothing of the tail that no point has seen.  A D_e left with an error
    above a tenth of itself is withheld, and the message says by how much it misses.
    """
    far = float(curve.energy[index][-1] - reference - parameters["bottom"])
    coverage = far / parameters["depth"]
    values["D_e_coverage"] = coverage
    errors["D_e"] = float(np.hypot(errors["D_e"], (1.0 - coverage) * values["D_e"]))
    if not errors["D_e"] < UNDETERMINED * values["D_e"]:
        share = errors.pop("D_e") / values.pop("D_e")
        why = f"its standard error would be {share:.0%} of it, more than {UNDETERMINED:.0%}"
        seen = f"the outermost point used lies at {coverage:.1%} of the fitted depth"
        return f"fitted; no D_e: {why} ({seen})"
    if coverage >= COVERED:
        return f"fitted; the far limit is covered: the outermost point used lies at {coverage:.1%} of D_e"
    return f"fitted; D_e is extrapolated: the outermost point used lies at {coverage:.1%} of it"
