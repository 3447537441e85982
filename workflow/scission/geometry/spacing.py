"""Lengths of a scan from its grid."""

import numpy as np
from numpy.typing import NDArray

GRADED_WIDTH = 0.15
"""Width of the dense region of a graded grid, as a fraction of the minimum's place."""


def even(first: float, last: float, points: int) -> NDArray[np.float64]:
    """``points`` equally spaced lengths, both ends included."""
    return np.linspace(first, last, points)


def graded(first: float, last: float, points: int, centre: float) -> NDArray[np.float64]:
    """Lengths dense about ``centre`` that thin out smoothly to both sides; the ends are exact.

    r(u) = centre + w sinh(u) with u evenly spaced and w = 0.15 centre, so the step at r is
    proportional to sqrt(w^2 + (r - centre)^2): nearly even inside the well, a constant factor
    from step to step far out.  All lengths in one unit.
    """
    width = GRADED_WIDTH * centre
    ends = np.arcsinh((np.array([first, last]) - centre) / width)
    lengths = centre + width * np.sinh(np.linspace(ends[0], ends[1], points))
    lengths[0], lengths[-1] = first, last
    return lengths
