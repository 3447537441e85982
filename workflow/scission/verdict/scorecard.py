"""How well a diagnostic foretold the error of a level, over all points of a campaign."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from scission.thresholds import Direction

FloatArray = npt.NDArray[np.float64]
BoolArray = npt.NDArray[np.bool_]

YOUDEN = "Youden, Cancer 3, 32 (1950)"


@dataclass(frozen=True)
class Counts:
    """Points by what the diagnostic said and what was so: over and wrong, over and right, and so on."""

    hits: int
    misses: int
    false_alarms: int
    correct: int

    @property
    def skill(self) -> float:
        """Share of the errors found less share of false alarms, -1 to 1; NaN if only one kind occurs."""
        wrong, right = self.hits + self.misses, self.false_alarms + self.correct
        return self.hits / wrong - self.false_alarms / right if wrong and right else float("nan")


@dataclass(frozen=True)
class Score:
    """A diagnostic against the errors of a level: counts at the threshold and at the best one.

    ``best`` is the threshold with the highest skill (Youden's index), half way between two values; NaN where
    the points are all in error or all good, or where no threshold does better than chance.  ``late`` (k,) is,
    for each scan where both are known, the onset less the end of the trusted interval: positive is too late.
    """

    at_threshold: Counts
    best: float
    at_best: Counts | None
    late: FloatArray


def score(
    values: FloatArray, wrong: BoolArray, bound: float, direction: Direction, late: Sequence[float] = ()
) -> Score:
    """Score ``values`` (n,) of a diagnostic against ``wrong`` (n,), whether the level was in error there."""
    sign = 1.0 if direction == "above" else -1.0
    v, b = sign * np.asarray(values, dtype=float), sign * bound
    best = _best(v, wrong, b)
    at_best = None if best is None else _count(v, wrong, best)
    place = float("nan") if best is None else sign * best
    return Score(_count(v, wrong, b), place, at_best, np.asarray(late, dtype=float))


def _count(v: FloatArray, wrong: BoolArray, bound: float) -> Counts:
    over = v > bound
    pairs = ((over, wrong), (~over, wrong), (over, ~wrong), (~over, ~wrong))
    return Counts(*(int(np.sum(a & b)) for a, b in pairs))


def _best(v: FloatArray, wrong: BoolArray, published: float) -> float | None:
    """Threshold of highest skill; of equal ones the nearest to the published."""
    unique = np.unique(v)
    if unique.size < 2 or wrong.all() or not wrong.any():
        return None
    candidates = (unique[1:] + unique[:-1]) / 2.0
    skills = np.array([_count(v, wrong, float(c)).skill for c in candidates])
    if skills.max() <= 0.0:
        return None
    equal = candidates[np.isclose(skills, skills.max())]
    return float(equal[np.argmin(np.abs(equal - published))])
