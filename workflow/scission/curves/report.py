"""All models on one curve, the preferred one, and the reasons in words."""

from collections.abc import Mapping
from dataclasses import replace
from types import ModuleType

import numpy as np

from scission.curves import local_polynomial
from scission.curves.curve import Curve, FitReport, ModelFit
from scission.curves.global_fit import fit_global
from scission.curves.local_polynomial import fit_local
from scission.curves.selection import FLAGGED_REACH, flagged, select

CAUTION = (
    f"caution: the points about the minimum are flagged themselves; flagged points up to "
    f"{FLAGGED_REACH} times its length are used"
)


def fit_with(models: Mapping[str, ModuleType], curve: Curve, window: tuple[float, float] | None) -> FitReport:
    """Fit the given models and the local polynomial.

    Flagged points stay out.  Where nothing can be fitted without them, as the level is doubted at its own
    minimum, they are admitted about it, with a caution in every message and a count among the rows.
    """
    fits = _fit_all(models, curve, window, admit_flagged=False)
    if not any(fit.fitted for fit in fits) and np.any(flagged(curve)):
        doubtful = _fit_all(models, curve, window, admit_flagged=True)
        if any(fit.fitted for fit in doubtful):
            fits = [replace(fit, message=f"{fit.message}; {CAUTION}") for fit in doubtful]
    preferred, reason = _prefer([fit for fit in fits if fit.fitted])
    return FitReport(tuple(fits), preferred, reason)


def _fit_all(
    models: Mapping[str, ModuleType], curve: Curve, window: tuple[float, float] | None, admit_flagged: bool
) -> list[ModelFit]:
    selection = select(curve, window, admit_flagged)
    fits = [fit_global(name, model, curve, selection) for name, model in models.items()]
    fits.append(fit_local(curve, selection))
    if selection.note:
        fits = [replace(fit, message=f"{fit.message}; the window ends {selection.note}") for fit in fits]
    return fits


def _prefer(fits: list[ModelFit]) -> tuple[str | None, str]:
    """The model with the lowest AICc of those of the whole well; they share points and weights."""
    whole = [fit for fit in fits if fit.model != local_polynomial.NAME]
    if not fits:
        return None, "no model could be fitted"
    if not whole:
        return local_polynomial.NAME, "only the local polynomial could be fitted"
    best = min(whole, key=lambda fit: fit.value("criterion"))
    if len(whole) == 1:
        return best.model, "the only model of the whole well that could be fitted" + _constants_from(fits)
    others = ", ".join(
        f"{fit.model} {fit.value('criterion') - best.value('criterion'):+.1f}"
        for fit in whole
        if fit is not best
    )
    return best.model, (
        f"lowest AICc on the same {best.value('points_used'):.0f} points and weights "
        f"({others} relative to it; residuals below the noise of the energies do not count)"
        + _constants_from(fits)
    )


def _constants_from(fits: list[ModelFit]) -> str:
    if not any(fit.model == local_polynomial.NAME for fit in fits):
        return ""
    return f"; for r_e, k_e and the spectroscopic constants see {local_polynomial.NAME}"
