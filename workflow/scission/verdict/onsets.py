"""Where along a scan a diagnostic crosses its threshold."""

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

from scission.thresholds import Direction, is_over

FloatArray = npt.NDArray[np.float64]

_RESTING, _MOVED = 1e-6, 1e-4
"""Up to here a value counts as resting, from here on as moved: converged determinants are exact to 1e-7."""


@dataclass(frozen=True)
class Onset:
    """One crossing: interpolated place, the two known points that bracket it, and words.

    NaN stands for a place or a side that is not known.
    """

    onset: float
    lower: float
    upper: float
    note: str


def onsets(
    coordinate: FloatArray,
    values: FloatArray,
    bound: float,
    direction: Direction,
    break_at: float | None = None,
) -> list[Onset]:
    """All crossings of ``bound`` by ``values`` (n,) along ``coordinate`` (n,), in order of the coordinate.

    Between the two points that bracket a crossing the place is the root of the monotone cubic
    through all known points (PCHIP: Fritsch and Carlson, SIAM J. Numer. Anal. 17, 238 (1980)), so it
    cannot leave the bracket.  Points without a value are skipped: the bracket widens and the note
    says so.  A diagnostic that is over from the first known point on gives an onset without a place;
    one that never crosses gives none.

    Unrestricted determinants rest at their restricted values and leave them with a kink, which no smooth
    curve follows: there the interpolation begins at the kink.  ``break_at`` is its place where it is known
    (the Coulson-Fischer distance); otherwise a parabola through the first three broken points gives it.

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
    missing = _missing(np.asarray(coordinate, dtype=float), x)
    grid, (x, y) = x, _from_the_kink(x, y, break_at)
    over = [is_over(float(value), bound, direction) for value in y]
    found = [_from_the_start(x)] if over[0] else []
    changes = [i for i in range(x.size - 1) if over[i] != over[i + 1]]
    crossings = [_crossing(x, y, i, bound, over[i + 1], missing) for i in changes]
    return found + [_on_grid(crossing, grid) for crossing in crossings]


def _known(x: FloatArray, y: FloatArray) -> tuple[FloatArray, FloatArray]:
    finite = np.isfinite(x) & np.isfinite(y)
    unique, first = np.unique(x[finite], return_index=True)
    return unique, y[finite][first]


def _missing(coordinate: FloatArray, known: FloatArray) -> FloatArray:
    return np.setdiff1d(coordinate[np.isfinite(coordinate)], known)


def _from_the_kink(x: FloatArray, y: FloatArray, break_at: float | None) -> tuple[FloatArray, FloatArray]:
    """The curve from its kink on; unchanged where it does not rest before it moves.

    Resting points beyond a known kink were left on the unbroken solution and are no part of the curve.
    """
    moved = np.flatnonzero(np.abs(y - y[0]) > _MOVED)
    if moved.size < 3 or moved[0] < 2 or np.abs(y[: moved[0]] - y[0]).max() > _RESTING:
        return x, y
    first = int(moved[0])
    place = _kink(x, y, first) if break_at is None else break_at
    if not x[0] <= place < x[first]:
        return x, y
    return np.concatenate([[place], x[first:]]), np.concatenate([[y[0]], y[first:]])


def _kink(x: FloatArray, y: FloatArray, first: int) -> float:
    """Where the parabola through the first three moved points meets the resting value, inside the bracket."""
    three = slice(first, first + 3)
    roots = np.roots(np.polyfit(x[three] - x[first], y[three] - y[0], 2)) + x[first]
    inside = [float(r.real) for r in roots if abs(r.imag) < 1e-12 and x[first - 1] < r.real < x[first]]
    return max(inside, default=float(x[first - 1]))


def _on_grid(crossing: Onset, grid: FloatArray) -> Onset:
    """The crossing with its lower side on a point of the scan, not on a kink between them."""
    below = grid[grid <= crossing.lower]
    return replace(crossing, lower=float(below[-1])) if below.size else crossing


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
