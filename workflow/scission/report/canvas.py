"""Matplotlib without a display and without a trace in the user's home folder.

Import ``Figure`` from here only: matplotlib writes a font cache when it is first imported.
"""

from __future__ import annotations

import atexit
import os
import shutil
import tempfile
from pathlib import Path
from typing import Any

if "MPLCONFIGDIR" not in os.environ:
    _folder = tempfile.mkdtemp(prefix="scission-figures-")
    os.environ["MPLCONFIGDIR"] = _folder
    atexit.register(shutil.rmtree, _folder, ignore_errors=True)

import matplotlib as mpl
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from scission.records.atomic import replacing

STYLE: dict[Any, Any] = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.linewidth": 0.8,
    "axes.labelsize": 9.0,
    "xtick.direction": "in",
    "ytick.direction": "in",
    "xtick.labelsize": 8.5,
    "ytick.labelsize": 8.5,
    "svg.hashsalt": "scission",  # the same figure gives the same file
    "svg.fonttype": "path",
}

PNG_DOTS_PER_INCH = 160

__all__ = ["STYLE", "Figure", "blank", "mpl", "save"]


def blank(width: float, height: float) -> Figure:
    """An empty figure, width and height in inches, that no global state knows of."""
    figure = Figure(figsize=(width, height))
    FigureCanvasAgg(figure)
    return figure


def save(figure: Figure, stem: Path) -> tuple[Path, Path]:
    """Write ``<stem>.svg`` and ``<stem>.png``, each whole or not at all.

    Raises:
        OSError: the folder cannot be written.
    """
    svg, png = stem.with_name(f"{stem.name}.svg"), stem.with_name(f"{stem.name}.png")
    with replacing(svg) as temporary, mpl.rc_context(STYLE):
        figure.savefig(temporary, format="svg", metadata={"Date": None, "Creator": None})
    with replacing(png) as temporary, mpl.rc_context(STYLE):
        figure.savefig(temporary, format="png", dpi=PNG_DOTS_PER_INCH, metadata={"Software": None})
    return svg, png
