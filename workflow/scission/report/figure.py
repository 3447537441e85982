"""One figure a scan: energies above, diagnostics against their thresholds below, one axis of length."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence

import pandas as pd
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.legend import Legend

from scission.report.axis import label, set_lengths
from scission.report.canvas import STYLE, Figure, blank, mpl
from scission.report.diagnostics import draw_diagnostic, shown
from scission.report.energies import draw_energies, mark_handles
from scission.report.style import looks

# Inches.  Fixed margins, so that the axes of all figures of a campaign line up under each other.
WIDTH, _LEFT, _RIGHT, _BOTTOM = 8.0, 1.5, 0.9, 0.55
_TITLE, _LEGEND_ROW, _ENERGIES, _PANEL, _GAP = 0.42, 0.175, 3.7, 0.56, 0.07
_LEGEND_COLUMNS = 6


def draw_scan(scan: str, frames: Mapping[str, pd.DataFrame], coordinate: str = "bond length") -> Figure:
    """Figure of one scan from the tables ``points`` and ``diagnostics``.

    Args:
        scan: name of the scan.
        frames: the tables.
        coordinate: name of the coordinate, without unit.

    Raises:
        ValueError: the tables hold no such scan.
    """
    points = frames["points"][frames["points"].scan == scan]
    if points.empty:
        raise ValueError(f"there is no scan {scan} in the tables")
    diagnostics = frames["diagnostics"][frames["diagnostics"].scan == scan]
    with mpl.rc_context(STYLE):
        return _draw(scan, points, diagnostics, coordinate)


def _draw(scan: str, points: pd.DataFrame, diagnostics: pd.DataFrame, coordinate: str) -> Figure:
    names, levels = shown(diagnostics), looks(list(dict.fromkeys(points.level)))
    columns = _columns(levels)
    figure, axes = _panels(len(names), -(-len(levels) // columns))
    handles = draw_energies(axes[0], points, levels)
    for panel, name in zip(axes[1:], names, strict=True):
        draw_diagnostic(panel, diagnostics[diagnostics.diagnostic == name], levels)
    logarithmic = False
    for panel in axes:
        logarithmic = set_lengths(panel, points.coordinate_angstrom.to_numpy())
        panel.tick_params(labelbottom=panel is axes[-1])
    axes[-1].set_xlabel(label(coordinate, logarithmic))
    height = figure.get_figheight()
    figure.text(_LEFT / WIDTH, 1 - 0.24 / height, scan, fontsize=11, fontweight="bold", va="center")
    below = _legend(figure, handles, _TITLE, columns, 3.2)
    _legend(figure, mark_handles(points), below + 0.02, 7, 1.2)
    return figure


def _columns(names: Collection[str]) -> int:
    """Columns of the legend that fit the longest name, estimated generously."""
    longest = 0.75 + 0.075 * max(len(name) for name in names)
    return max(1, min(_LEGEND_COLUMNS, len(names), int((WIDTH - _LEFT) / longest)))


def _legend(figure: Figure, handles: Sequence[Artist], top: float, columns: int, length: float) -> float:
    """Put a legend ``top`` inches below the upper edge; gives the distance of its lower edge."""
    figure.add_artist(
        Legend(
            figure,
            handles,
            [str(handle.get_label()) for handle in handles],
            loc="upper left",
            bbox_to_anchor=(_LEFT / WIDTH, 1 - top / figure.get_figheight()),
            bbox_transform=figure.transFigure,
            ncols=min(columns, len(handles)),
            frameon=False,
            borderaxespad=0,
            borderpad=0,
            handlelength=length,
            columnspacing=1.3,
            handletextpad=0.5,
            fontsize=8.2,
        )
    )
    return top + _LEGEND_ROW * -(-len(handles) // columns)


def _panels(n_diagnostics: int, legend_rows: int) -> tuple[Figure, list[Axes]]:
    """Figure and its axes, from top to bottom."""
    top = _TITLE + _LEGEND_ROW * (legend_rows + 1) + 0.12
    height = top + _ENERGIES + n_diagnostics * (_PANEL + _GAP) + _BOTTOM
    figure = blank(WIDTH, height)
    edges = [height - top - _ENERGIES]
    edges += [edges[0] - (i + 1) * (_PANEL + _GAP) for i in range(n_diagnostics)]
    sizes = [_ENERGIES, *[_PANEL] * n_diagnostics]
    width = WIDTH - _LEFT - _RIGHT
    boxes = [
        (_LEFT / WIDTH, y / height, width / WIDTH, h / height) for y, h in zip(edges, sizes, strict=True)
    ]
    return figure, [figure.add_axes(box) for box in boxes]
