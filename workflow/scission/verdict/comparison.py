"""How far a level can be trusted along a scan: its energies against those of a reference level.

The error at a length is E_level - E_reference there, less the same difference at the minimum of the
reference level: a constant error does no harm to a curve, so it is left out.  Between the points the
difference is interpolated by a monotone cubic, which is smooth where both curves have steep walls.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy.interpolate import PchipInterpolator
from scipy.optimize import brentq

FloatArray = npt.NDArray[np.float64]

TO_THE_END = "holds to the last point"
FROM_THE_START = "holds from the first point"


@dataclass(frozen=True)
class Edge:
    """One end of a trusted interval: its place, the points that bracket it, and why it lies there.

    ``open`` is true where the error does not leave the tolerance at this end: what lies beyond is not known.
    """

    place: float
    lower: float
    upper: float
    open: bool
    note: str


@dataclass(frozen=True)
class Comparison:
    """One level against the reference level of a scan.

    Lengths are in the unit of the coordinate given, energies in that of the energies given.  ``error`` (n,)
    has NaN where either level has no result.  ``npe`` is the largest less the smallest error (non-parallelity
    error).  ``inner`` and ``outer`` bound the lengths about the minimum where the error stays within the
    tolerance; None where nothing can be said, for the reason in ``problem``.
    """

    error: FloatArray
    minimum: float = float("nan")
    largest: float = float("nan")
    largest_at: float = float("nan")
    mean_absolute: float = float("nan")
    npe: float = float("nan")
    inner: Edge | None = None
    outer: Edge | None = None
    problem: str = ""


def compare(x: FloatArray, energy: FloatArray, reference: FloatArray, tolerance: float) -> Comparison:
    """Compare a level's ``energy`` (n,) with the ``reference`` level's (n,) at the lengths ``x`` (n,)."""
    x, energy, reference = (np.asarray(a, dtype=float) for a in (x, energy, reference))
    blank = np.full(x.shape, np.nan)
    minimum, problem = _minimum(x, reference)
    known = np.isfinite(energy) & np.isfinite(reference) & np.isfinite(x)
    if problem or known.sum() < 3:
        return Comparison(blank, minimum, problem=problem or "fewer than three points have both results")
    order = np.argsort(x[known])
    places, difference = x[known][order], (energy - reference)[known][order]
    if not places[0] <= minimum <= places[-1]:
        return Comparison(blank, minimum, problem="the level has no results on both sides of the minimum")
    curve = PchipInterpolator(places, difference)
    error = energy - reference - float(curve(minimum))
    values = error[known]
    worst = int(np.argmax(np.abs(values)))
    gaps = np.sort(x[np.isfinite(x) & ~known])
    shifted = PchipInterpolator(places, difference - float(curve(minimum)))
    return Comparison(
        error,
        minimum,
        float(values[worst]),
        float(x[known][worst]),
        float(np.mean(np.abs(values))),
        float(np.ptp(values)),
        _edge(shifted, places, gaps, minimum, tolerance, outward=False),
        _edge(shifted, places, gaps, minimum, tolerance, outward=True),
    )


def _minimum(x: FloatArray, energy: FloatArray) -> tuple[float, str]:
    """Place of the lowest interior minimum, from the polynomial through up to five points about it."""
    known = np.isfinite(x) & np.isfinite(energy)
    order = np.argsort(x[known])
    r, e = x[known][order], energy[known][order]
    inside = [i for i in range(1, r.size - 1) if e[i - 1] >= e[i] <= e[i + 1]]
    if not inside:
        return float("nan"), "the reference level has no minimum among its points"
    i = min(inside, key=lambda i: float(e[i]))
    near = slice(max(i - 2, 0), i + 3)
    slope = np.polyder(np.polyfit(r[near] - r[i], e[near] - e[i], r[near].size - 1))
    flat = [float(z.real) + r[i] for z in np.roots(slope) if abs(z.imag) < 1e-9]
    inner = [place for place in flat if r[i - 1] <= place <= r[i + 1]]
    return min(inner, key=lambda place: abs(place - r[i]), default=float(r[i])), ""


def _edge(
    curve: PchipInterpolator,
    places: FloatArray,
    gaps: FloatArray,
    minimum: float,
    tolerance: float,
    outward: bool,
) -> Edge:
    """Walk from the minimum point by point until the error leaves the tolerance or a result is missing."""
    way = places[places > minimum] if outward else places[places < minimum][::-1]
    before = minimum
    for place in map(float, way):
        blank = _first_gap(gaps, before, place, outward)
        if blank is not None:
            return _open(before, blank)
        value = float(curve(place))
        if abs(value) > tolerance:
            sense = "above" if value > 0.0 else "below"
            low, high = min(before, place), max(before, place)
            note = f"beyond it the level lies too far {sense}"
            return Edge(_root(curve, before, place, tolerance), low, high, False, note)
        before = place
    blank = _first_gap(gaps, before, np.inf if outward else -np.inf, outward)
    if blank is not None:
        return _open(before, blank)
    return Edge(before, before, before, True, TO_THE_END if outward else FROM_THE_START)


def _first_gap(gaps: FloatArray, start: float, end: float, outward: bool) -> float | None:
    """The first length without a result on the way from ``start`` to ``end``."""
    between = gaps[(gaps > min(start, end)) & (gaps < max(start, end))]
    return None if not between.size else float(between.min() if outward else between.max())


def _open(last: float, blank: float) -> Edge:
    """An end where trust stops because a result is missing."""
    note = f"within the tolerance to the last point before {blank:.4g}, which has no result"
    return Edge(last, min(last, blank), max(last, blank), True, note)


def _root(curve: PchipInterpolator, good: float, bad: float, tolerance: float) -> float:
    """First place on the way from ``good`` to ``bad`` where the error reaches the tolerance."""
    level = tolerance if float(curve(bad)) > 0.0 else -tolerance
    return float(brentq(lambda place: float(curve(place)) - level, good, bad))
