"""What goes into a fit and what comes out of it: plain, immutable containers."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

import numpy as np
import numpy.typing as npt

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]
IntArray = npt.NDArray[np.intp]

FITTED = "fitted"
NOT_FITTED = "not fitted"
FLAGGED = "flagged"


@dataclass(frozen=True)
class Curve:
    """One scan at one level, as the fits see it.

    ``r`` (n,) bohr and ``energy`` (n,) hartree in any order; ``usable`` (n,) says which points
    may enter a fit and ``why_not`` (n) why the others may not.  A reason that starts with
    ``flagged`` means that the level is doubted there; every other one that the number is missing.
    ``reduced_mass`` is in electron masses; ``fragment_limit`` is the sum of the fragments'
    energies in hartree, where it is known.

    Raises:
        ValueError: the arrays differ in length.
    """

    r: FloatArray
    energy: FloatArray
    usable: BoolArray
    why_not: list[str]
    reduced_mass: float | None = None
    diatomic: bool = True
    fragment_limit: float | None = None

    def __post_init__(self) -> None:
        object.__setattr__(self, "r", np.asarray(self.r, dtype=float))
        object.__setattr__(self, "energy", np.asarray(self.energy, dtype=float))
        object.__setattr__(self, "usable", np.asarray(self.usable, dtype=bool))
        lengths = {"r": self.r.shape, "energy": self.energy.shape, "usable": self.usable.shape}
        if len(set(lengths.values())) != 1 or self.r.ndim != 1 or len(self.why_not) != self.r.size:
            raise ValueError(
                f"Curve: r, energy, usable and why_not need one entry per point; "
                f"got {lengths} and {len(self.why_not)} reasons"
            )


@dataclass(frozen=True)
class FitRow:
    """One number of a fit; ``stderr`` is NaN where none can be given, ``unit`` is ``1`` for pure numbers."""

    model: str
    quantity: str
    value: float
    stderr: float
    unit: str


@dataclass(frozen=True)
class ModelFit:
    """One model on one curve.

    ``residual`` (n,) is energy minus model in hartree, in the order of the curve, also for points
    that were left out (NaN where there is no energy or no model); ``used`` (n,) and
    ``why_left_out`` (n, empty for used points) account for every point.
    """

    model: str
    status: str
    message: str
    used: BoolArray
    why_left_out: list[str]
    residual: FloatArray
    rows: tuple[FitRow, ...] = ()
    parameters: dict[str, float] = field(default_factory=dict)

    @property
    def fitted(self) -> bool:
        """True where the model has numbers."""
        return self.status == FITTED

    def value(self, quantity: str) -> float:
        """The value of a quantity, NaN where the fit does not give it."""
        return next((row.value for row in self.rows if row.quantity == quantity), float("nan"))

    def stderr(self, quantity: str) -> float:
        """The standard error of a quantity, NaN where the fit does not give it."""
        return next((row.stderr for row in self.rows if row.quantity == quantity), float("nan"))


@dataclass(frozen=True)
class FitReport:
    """All models on one curve; ``preferred`` is the marked one, ``reason`` says by which criterion."""

    fits: tuple[ModelFit, ...]
    preferred: str | None
    reason: str

    @property
    def rows(self) -> tuple[FitRow, ...]:
        """The rows of every fitted model, one after another."""
        return tuple(row for fit in self.fits for row in fit.rows)

    def fit(self, model: str) -> ModelFit:
        """The fit of one model; raises KeyError for a model that was not asked for."""
        found = {fit.model: fit for fit in self.fits}
        return found[model]


def residuals(curve: Curve, energy: Callable[..., FloatArray], parameters: Mapping[str, float]) -> FloatArray:
    """Energy minus model (n,) in hartree; NaN where a point has no energy or no proper length."""
    result = np.full(curve.r.size, np.nan)
    known = np.isfinite(curve.energy) & np.isfinite(curve.r) & (curve.r > 0.0)
    result[known] = curve.energy[known] - energy(curve.r[known], **parameters)
    return result


def not_fitted(model: str, message: str, why: list[str]) -> ModelFit:
    """A model without numbers, every point of it left out with its reason."""
    n = len(why)
    reasons = [reason or "nothing was fitted" for reason in why]
    return ModelFit(model, NOT_FITTED, message, np.zeros(n, dtype=bool), reasons, np.full(n, np.nan))
