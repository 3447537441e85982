"""The upper panel: energies of all levels, each from its own minimum, with flagged and failed points."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from scission.report.style import INK, OVER_SHADE, THRESHOLD_DASHES, Look
from scission.units import HARTREE_IN_EV, HARTREE_IN_KCAL_PER_MOL

LABEL = "energy above the level's own minimum / eV"
_FLAG_WORDS = {
    "single-reference": "single-reference",
    "borderline": "borderline",
    "multireference": "multireference",
}
_KCAL = HARTREE_IN_KCAL_PER_MOL / HARTREE_IN_EV


def draw_energies(axes: Axes, points: pd.DataFrame, looks: Mapping[str, Look]) -> list[Line2D]:
    """Draw curves and marks; gives the handles of the legend, levels first."""
    failing = 0
    for name, look in looks.items():
        level = points[points.level == name].sort_values("coordinate_angstrom")
        _curve(axes, level, look)
        _failures(axes, level, look, failing)
        failing += int((level.status != "converged").any())
    _limit(axes, points)
    if points.relative_energy_ev.isna().all():
        axes.text(0.5, 0.5, "no point has a result", transform=axes.transAxes, ha="center", color=INK)
    axes.axhline(0.0, color=INK, linewidth=0.5, zorder=0)
    axes.set_ylabel(LABEL)
    right = axes.secondary_yaxis("right", functions=(_to_kcal, _to_ev))
    right.set_ylabel("the same / (kcal/mol)")
    return [_level_handle(name, look) for name, look in looks.items()]


def _to_kcal(ev: Any) -> Any:
    return ev * _KCAL


def _to_ev(kcal: Any) -> Any:
    return kcal / _KCAL


def _curve(axes: Axes, level: pd.DataFrame, look: Look) -> None:
    x, y = level.coordinate_angstrom, level.relative_energy_ev
    axes.plot(x, y, linestyle=look.line, color=look.colour, linewidth=1.3)
    for flag, part in level.groupby("flag"):
        axes.plot(
            part.coordinate_angstrom,
            part.relative_energy_ev,
            look.marker,
            markersize=4.6,
            markerfacecolor=look.face(str(flag)),
            markeredgecolor=look.colour,
            markeredgewidth=0.9,
        )


def _failures(axes: Axes, level: pd.DataFrame, look: Look, row: int) -> None:
    """Crosses at the lower edge, one line a level, since these points have no energy to be drawn at."""
    failed = level[level.status != "converged"]
    height = np.full(len(failed), 0.03 + 0.035 * row)
    axes.plot(
        failed.coordinate_angstrom,
        height,
        "x",
        color=look.colour,
        markersize=5.5,
        markeredgewidth=1.4,
        transform=axes.get_xaxis_transform(),
        clip_on=False,
        zorder=5,
    )


def _limit(axes: Axes, points: pd.DataFrame) -> None:
    """Frame the well: the inner wall and a level that runs away leave the picture at its edge."""
    rims = [_rim(level) for _, level in points.groupby("level")]
    rims = [rim for rim in rims if np.isfinite(rim) and rim > 0]
    top = min(max(rims), 2.2 * float(np.median(rims))) if rims else 1.0
    lowest = float(np.nanmin([0.0, *points.relative_energy_ev]))
    failed = points[points.status != "converged"].level.nunique()
    bottom = max(lowest, -0.6 * top) - (0.06 + 0.035 * failed) * top
    axes.set_ylim(bottom, 1.12 * top)


def _rim(level: pd.DataFrame) -> float:
    """Highest energy outward of the minimum."""
    known = level.dropna(subset=["relative_energy_ev"]).sort_values("coordinate_angstrom")
    if known.empty:
        return float("nan")
    at = int(np.argmin(np.abs(known.relative_energy_ev.to_numpy())))
    return float(known.relative_energy_ev.iloc[at:].max())


def _level_handle(name: str, look: Look) -> Line2D:
    return Line2D(
        [],
        [],
        linestyle=look.line,
        color=look.colour,
        marker=look.marker,
        markersize=4.6,
        linewidth=1.3,
        label=name,
    )


def mark_handles(points: pd.DataFrame) -> list[Artist]:
    """Legend of the marks that occur: fill by flag, cross for a point without a result."""
    grey = Look("#555555", (), "o")
    handles: list[Artist] = [
        _mark("o", word, grey.face(flag)) for flag, word in _FLAG_WORDS.items() if (points.flag == flag).any()
    ]
    if (points.flag == "undetermined").any() and not (points.flag == "multireference").any():
        handles.append(_mark("o", "undetermined", "white"))
    if (points.status != "converged").any():
        handles.append(_mark("x", "no result", "#555555"))
    return [*handles, *_threshold_handles()]


def _threshold_handles() -> list[Artist]:
    shade = Patch(facecolor=OVER_SHADE, edgecolor="#777777", linewidth=0.7, label="beyond threshold")
    shade.set_linestyle(THRESHOLD_DASHES)
    return [shade]


def _mark(marker: str, label: str, face: str) -> Line2D:
    return Line2D(
        [],
        [],
        linestyle="",
        marker=marker,
        markersize=5,
        markerfacecolor=face,
        markeredgecolor="#555555",
        label=label,
    )
