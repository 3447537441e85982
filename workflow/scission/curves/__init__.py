"""Curve models: from the energies of a scan to r_e, D_e, k_e and spectroscopic constants.

``MODELS`` is the registry of models that describe a whole well.  A new member is one module here:

- ``PARAMETERS``: names of all its parameters, in the order of ``energy``.  Every model has ``r_e``
  (the length of its minimum, bohr), ``depth`` (dissociation energy from the minimum, hartree) and
  ``bottom`` (energy at the minimum, hartree); the others are its own, in powers of 1/bohr.
- ``POSITIVE``: names of the parameters that are kept above zero.
- ``energy(r, **parameters)``: a plain function of lengths (n,) in bohr, returning (n,) hartree;
  finite for every r > 0 and all parameters within their bounds.
- ``guess(r, e)``: start values of all parameters from a sorted curve with an interior minimum;
  finite, whatever the energies.
- ``derivatives(parameters)``: second to fourth derivative at ``r_e`` (hartree/bohr^k).

From these follow, for all models alike, k_e = f2, D_e = depth, and the spectroscopic constants
by Dunham's relations (``constants``).  Enter it in ``MODELS`` under the name that campaigns use.
Every member inherits the tests of ``tests/contract/test_curve_models.py``.

``fit_curve`` fits the models that are asked for and, always, a local polynomial about the minimum
(``local_polynomial``), which no registry lists as it describes no whole well.
"""

from types import ModuleType

from scission.curves import extended_rydberg, local_polynomial, morse
from scission.curves.curve import Curve, FitReport, FitRow, FloatArray, ModelFit
from scission.curves.report import fit_with

MODELS: dict[str, ModuleType] = {
    "morse": morse,
    "extended-rydberg": extended_rydberg,
}

LOCAL = local_polynomial.NAME

__all__ = ["LOCAL", "MODELS", "Curve", "FitReport", "FitRow", "ModelFit", "fit_curve", "model_energy"]


def fit_curve(
    curve: Curve,
    models: tuple[str, ...] | list[str] = tuple(MODELS),
    window: tuple[float, float] | None = None,
) -> FitReport:
    """Fit the named models and the local polynomial to a curve.

    ``window`` (lower, upper), bohr, limits the lengths.  Bad data give a report in words, no error.

    Raises:
        ValueError: a model is not in the registry.
    """
    unknown = [name for name in models if name not in MODELS]
    if unknown:
        raise ValueError(f"fit models: {unknown} are not curve models ({', '.join(MODELS)})")
    return fit_with({name: MODELS[name] for name in models}, curve, window)


def model_energy(fit: ModelFit, r: FloatArray) -> FloatArray:
    """Energy (n,) in hartree of a fitted model at lengths ``r`` (n,) in bohr.

    Raises:
        ValueError: the model was not fitted.
    """
    if not fit.fitted:
        raise ValueError(f"model_energy: {fit.model} was not fitted ({fit.message})")
    model = local_polynomial if fit.model == LOCAL else MODELS[fit.model]
    energy: FloatArray = model.energy(r, **fit.parameters)
    return energy
