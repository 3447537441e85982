"""Where along a scan a diagnostic crosses its threshold."""

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from scission.thresholds import Direction, is_over

FloatArray = npt.NDArray[np.float64]


@dataclass(frozen=True)
class Onset:
    """One crossing: interpolated place, the two known points that bracket it, and words.

    NaN stands for a place or a side that is not known.
    """

    onset: float
    lower: float
    upper: float
    note: str


def onsets(coordinate: FloatArray, values: FloatArray, bound: float, direction: Direction) -> list[Onset]:
    """All crossings of ``bound`` by ``values`` (n,) along ``coordinate`` (n,), in order of the coordinate.

    Between the two points that bracket a crossing the place is the root of the monotone cubic
    through all known points (PCHIP: Fritsch and Carlson, SIAM J. Numer. Anal. 17, 238 (1980)), so it
    cannot leave the bracket.  Points without a value are skipped: the bracket widens and the note
    says so.  A diagnostic that is over from the first known point on gives an onset without a place;
    one that never crosses gives none.

    Raises:
        ValueError: the arrays differ in shape.
    """
    if np.shape(coordinate) != np.shape(values) or np.ndim(coordinate) != 1:
        raise ValueError(
            f"onsets: coordinate {np.shape(coordinate)} and values {np.shape(values)} must be equally long"
        )
    x, y = _known(np.asarray(coordinate, dtype=float), np.asarray(values, dtype=float))
    if x.size == 0:
        return []
    over = [is_over(float(value), bound, direction) for value in y]
    found = [_from_the_start(x)] if over[0] else []
    missing = _missing(np.asarray(coordinate, dtype=float), x)
    changes = [i for i in range(x.size - 1) if over[i] != over[i + 1]]
    return found + [_crossing(x, y, i, bound, over[i + 1], missing) for i in changes]


def _known(x: FloatArray, y: FloatArray) -> tuple[FloatArray, FloatArray]:
    finite = np.isfinite(x) & np.isfinite(y)
    unique, first = np.unique(x[finite], return_index=True)
    return unique, y[finite][first]


def _missing(coordinate: FloatArray, known: FloatArray) -> FloatArray:
    return np.setdiff1d(coordinate[np.isfinite(coordinate)], known)


def _from_the_start(x: FloatArray) -> Onset:
    return Onset(float("nan"), float("nan"), float(x[0]), "over the threshold from the first known point on")


def _crossing(x: FloatArray, y: FloatArray, i: int, bound: float, rises: bool, missing: FloatArray) -> Onset:
    lower, upper = float(x[i]), float(x[i + 1])
    note = "crosses the threshold" if rises else "falls back within the threshold"
    gaps = int(np.sum((missing > lower) & (missing < upper)))
    if gaps:
        note += f"; {gaps} point{'s' if gaps > 1 else ''} without a value inside the bracket"
    return Onset(_root(x, y - bound, lower, upper), lower, upper, note)


def _root(x: FloatArray, height: FloatArray, lower: float, upper: float) -> float:
    """Root of the interpolated height in a bracket; an end that touches zero is the root itself."""
    curve = PchipInterpolator(x, height)
    ends = {lower: float(curve(lower)), upper: float(curve(upper))}
    if ends[lower] * ends[upper] < 0.0:
        return float(brentq(lambda place: float(curve(place)), lower, upper))
    return min(ends, key=lambda place: abs(ends[place]))
