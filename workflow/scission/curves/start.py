"""Start values: where a curve has its minimum, and models that are linear but for one parameter."""

from collections.abc import Callable

import numpy as np

from scission.curves.curve import FloatArray


def vertex(r: FloatArray, e: FloatArray) -> float:
    """Vertex of the parabola through the lowest point and its two neighbours, bohr.

    ``r`` (n,) increasing and ``e`` (n,), n at least 3.  Where the lowest point is the first or
    the last one, or the parabola is flat, the lowest point itself.
    """
    i = int(np.argmin(e))
    if i in (0, r.size - 1):
        return float(r[i])
    x, y = r[i - 1 : i + 2] - r[i], e[i - 1 : i + 2] - e[i]
    curvature, slope, _ = np.polyfit(x, y, 2)
    shift = -slope / (2.0 * curvature) if curvature > 0.0 else 0.0
    return float(r[i] + np.clip(shift, x[0], x[2]))


def best_linear(
    columns: Callable[[float], FloatArray],
    e: FloatArray,
    trials: FloatArray,
    sensible: Callable[[FloatArray], bool],
) -> tuple[float, FloatArray]:
    """The trial value whose linear least-squares fit is the best sensible one, and its coefficients.

    ``columns(trial)`` is the (n, k) matrix of the model, ``e`` (n,).  Where no trial is sensible
    the best of all is taken: the fit that follows then judges it.
    """
    found = []
    for trial in trials:
        matrix = columns(float(trial))
        coefficients = np.asarray(np.linalg.lstsq(matrix, e, rcond=None)[0], dtype=np.float64)
        misfit = float(np.sum((matrix @ coefficients - e) ** 2))
        found.append((not sensible(coefficients), misfit, float(trial), coefficients))
    _, _, trial, coefficients = min(found, key=lambda item: item[:2])
    return trial, coefficients
