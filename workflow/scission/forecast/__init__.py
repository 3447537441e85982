"""What a campaign will cost before anything is computed: time, memory, disk.

``cost`` holds the scaling of every method with the number of basis functions; ``calibration`` the factors by
which finished records on this machine differ from it; ``estimate`` adds a plan up.  A new method needs one
entry in a table of ``cost``.
"""

from scission.forecast.calibration import Calibration, calibrate
from scission.forecast.cost import (
    MARGIN,
    SHORTEST_BUDGET_S,
    budget_seconds,
    correlate_memory_mb,
    correlate_seconds,
    determinants,
    fragment_seconds,
    n_functions,
    reference_memory_mb,
    reference_seconds,
)
from scission.forecast.estimate import Forecast, Line, estimate

__all__ = [
    "MARGIN",
    "SHORTEST_BUDGET_S",
    "Calibration",
    "Forecast",
    "Line",
    "budget_seconds",
    "calibrate",
    "correlate_memory_mb",
    "correlate_seconds",
    "determinants",
    "estimate",
    "fragment_seconds",
    "n_functions",
    "reference_memory_mb",
    "reference_seconds",
]
