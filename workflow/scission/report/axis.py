"""The axis of the bond length, shared by all panels of a figure."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.ticker import FixedLocator, FuncFormatter, NullLocator

LOGARITHMIC_FROM = 4.0
_TICKS = (0.1, 0.2, 0.3, 0.5, 0.7, 1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0, 10.0, 15.0, 20.0, 30.0, 50.0, 100.0)


def set_lengths(axes: Axes, lengths: np.ndarray) -> bool:
    """Scale the axis to the scan; logarithmic, so that the well is not squeezed, if it spans far.

    Returns whether it is logarithmic.
    """
    low, high = float(np.min(lengths)), float(np.max(lengths))
    logarithmic = low > 0 and high / low >= LOGARITHMIC_FROM
    if logarithmic:
        axes.set_xscale("log")
        ticks = [tick for tick in _TICKS if low / 1.03 <= tick <= high * 1.03]
        axes.xaxis.set_major_locator(FixedLocator(ticks))
        axes.xaxis.set_minor_locator(NullLocator())
        axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axes.set_xlim(low / 1.06, high * 1.06)
    else:
        margin = 0.04 * (high - low) or 0.1
        axes.set_xlim(low - margin, high + margin)
    return logarithmic


def label(name: str, logarithmic: bool) -> str:
    """Label of the axis with its unit."""
    return f"{name} / angstrom" + (" (logarithmic scale)" if logarithmic else "")
