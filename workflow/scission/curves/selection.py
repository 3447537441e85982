"""Which points of a curve a fit may use, and in words why the others are left out."""

from dataclasses import dataclass

import numpy as np

from scission.curves.curve import FLAGGED, BoolArray, Curve, FloatArray, IntArray
from scission.units import BOHR_IN_ANGSTROM

SHALLOWEST_WELL = 1e-6  # hartree; below it a dip cannot be told from the noise of converged energies
HUMP = 5e-4  # hartree; an outward fall by more than this is no bond curve's tail
LEAST_CEILING = 0.05  # hartree; short scans keep their inner wall at least this high
FLAGGED_REACH = 1.4  # in units of the minimum's length: how far flagged points are admitted


@dataclass(frozen=True)
class Selection:
    """Points for the fits: ``index`` (m,) into the curve, by increasing length.

    ``why`` (n) is empty for the selected points.  ``problem`` says in words why nothing can be
    fitted, empty otherwise; ``note`` says where and why the window ends before the scan does.
    """

    index: IntArray
    why: list[str]
    problem: str = ""
    note: str = ""


def flagged(curve: Curve) -> BoolArray:
    """Points (n,) that are left out because the level is doubted there, though they have an energy."""
    marks = [reason.startswith(FLAGGED) for reason in curve.why_not]
    return np.array(marks, dtype=bool) & ~curve.usable & np.isfinite(curve.energy)


def select(curve: Curve, window: tuple[float, float] | None, admit_flagged: bool = False) -> Selection:
    """Points of the well around the lowest interior minimum, outward until the curve ends to be one.

    The run ends at the first flagged point, at two or more missing points in a row (one alone is
    bridged) and where the energy falls again; points of the inner wall above the far end of the
    well are left out, as no bound state reaches them.  ``window`` (lower, upper) in bohr limits it further.
    """
    why = _reasons(curve, window, admit_flagged)
    order = np.argsort(curve.r, kind="stable")
    candidates = np.array([i for i in order if not why[i]], dtype=np.intp)
    minimum, problem = _minimum(curve.r[candidates], curve.energy[candidates])
    if problem:
        return Selection(candidates, why, problem)
    lowest = int(candidates[minimum])
    if admit_flagged:
        _leave_far_flagged(curve, why, FLAGGED_REACH * float(curve.r[lowest]))
    cause, last = _cut_runs(curve, why, order, lowest)
    _cut_inner_wall(curve, why, lowest)
    end = f"at {curve.r[last] * BOHR_IN_ANGSTROM:.3f} angstrom, farther points are {cause}"
    index = np.array([i for i in order if not why[i]], dtype=np.intp)
    return Selection(index, why, "", end if cause else "")


def _reasons(curve: Curve, window: tuple[float, float] | None, admit_flagged: bool) -> list[str]:
    lower, upper = window if window is not None else (0.0, np.inf)
    admitted = flagged(curve) if admit_flagged else np.zeros(curve.r.size, dtype=bool)
    why: list[str] = []
    kept: set[float] = set()
    for i, (r, e) in enumerate(zip(curve.r, curve.energy, strict=True)):
        reason = "" if curve.usable[i] or admitted[i] else (curve.why_not[i] or "not usable")
        if not reason and not (np.isfinite(r) and r > 0.0):
            reason = "its length is not a positive number"
        if not reason and not np.isfinite(e):
            reason = "its energy is not a finite number"
        if not reason and not lower <= r <= upper:
            reason = "outside the fit window"
        if not reason and round(float(r), 8) in kept:
            reason = "the same length as another point"
        if not reason:
            kept.add(round(float(r), 8))
        why.append(reason)
    return why


def _minimum(r: FloatArray, e: FloatArray) -> tuple[int, str]:
    """Position of the lowest interior minimum of a sorted curve, or the reason why there is none."""
    if r.size == 0:
        return -1, "there is no usable point"
    if r.size < 3:
        return -1, f"a minimum needs at least 3 usable points; there are {r.size}"
    inside = [i for i in range(1, r.size - 1) if e[i - 1] >= e[i] <= e[i + 1]]
    deep = [i for i in inside if min(e[:i].max(), e[i:].max()) - e[i] > SHALLOWEST_WELL]
    if deep:
        return min(deep, key=lambda i: float(e[i])), ""
    if inside and np.ptp(e) <= SHALLOWEST_WELL:
        return -1, f"no minimum: the curve is flat within {SHALLOWEST_WELL:g} hartree"
    if int(np.argmin(e)) <= r.size // 2:
        return -1, "no minimum in range: the energy rises outward from the shortest usable length"
    return -1, "no minimum in range: the curve is repulsive, the energy falls outward to its far end"


def _leave_far_flagged(curve: Curve, why: list[str], reach: float) -> None:
    for i in np.flatnonzero(flagged(curve)):
        if not why[i] and curve.r[i] > reach:
            why[i] = curve.why_not[i]


def _cut_runs(curve: Curve, why: list[str], order: IntArray, lowest: int) -> tuple[str, int]:
    """Leave out what lies beyond the end of the run on either side; why and where the outer side ends."""
    at = int(np.flatnonzero(order == lowest)[0])
    cause, last = _end_of_run(curve, why, order[at:])
    _leave_beyond(curve, why, order[at:], last, cause)
    inner_cause, first = _end_of_run(curve, why, order[: at + 1][::-1])
    _leave_beyond(curve, why, order[: at + 1][::-1], first, inner_cause)
    return cause, last


def _end_of_run(curve: Curve, why: list[str], path: IntArray) -> tuple[str, int]:
    """Why and with which point the run along ``path`` (from the minimum away) ends; '' if it does not."""
    last = top = int(path[0])
    missing = 0
    doubted = flagged(curve)
    for i in path[1:]:
        if why[i]:
            if doubted[i]:
                return "beyond the first flagged point", last
            missing += 0 if why[i].startswith(("the same length", "outside")) else 1
            if missing > 1:
                return "beyond two missing points in a row", last
            continue
        missing, last = 0, int(i)
        top = last if curve.energy[i] > curve.energy[top] else top
        if curve.energy[i] < curve.energy[top] - HUMP:
            return "beyond the point where the energy falls again", top
    return "", last


def _leave_beyond(curve: Curve, why: list[str], path: IntArray, last: int, cause: str) -> None:
    limit = abs(curve.r[last] - curve.r[path[0]])
    for i in path:
        if cause and not why[i] and abs(curve.r[i] - curve.r[path[0]]) > limit:
            why[i] = cause


def _cut_inner_wall(curve: Curve, why: list[str], lowest: int) -> None:
    bottom = float(curve.energy[lowest])
    outer = [
        float(e)
        for e, r, left in zip(curve.energy, curve.r, why, strict=True)
        if not left and r >= curve.r[lowest]
    ]
    depth = max(outer) - bottom
    if curve.fragment_limit is not None and np.isfinite(curve.fragment_limit):
        depth = max(depth, curve.fragment_limit - bottom)
    ceiling = bottom + max(depth, LEAST_CEILING)
    for i in range(curve.r.size):
        if not why[i] and curve.r[i] < curve.r[lowest] and curve.energy[i] > ceiling:
            why[i] = "on the inner wall, above the far end of the well"
