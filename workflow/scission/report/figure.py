"""One figure a scan: energies above, diagnostics against their thresholds below, one axis of length."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence

import pandas as pd
from matplotlib.artist import Artist
from matplotlib.axes import Axes
from matplotlib.legend import Legend

from scission.report.axis import label, set_lengths
from scission.report.bond import draw_bond, has_bond_picture
from scission.report.canvas import STYLE, Figure, blank, mpl
from scission.report.diagnostics import draw_diagnostic, shown
from scission.report.energies import draw_energies, mark_handles
from scission.report.style import looks
from scission.report.trust import ROW_INCHES, draw_trust, headline, trust_handles
from scission.tables import COLUMNS

# Inches.  Fixed margins, so that the axes of all figures of a campaign line up under each other.
WIDTH, _LEFT, _RIGHT, _BOTTOM = 8.0, 1.5, 0.9, 0.55
_TITLE, _LEGEND_ROW, _ENERGIES, _PANEL, _GAP = 0.42, 0.175, 3.7, 0.56, 0.07
_BOND, _WHY_LINE, _WHY_LEFT = 0.85, 0.16, 0.4
_LEGEND_COLUMNS = 6


def draw_scan(scan: str, frames: Mapping[str, pd.DataFrame], coordinate: str = "bond length") -> Figure:
    """Figure of one scan: energies, flags and trusted intervals, diagnostics, the picture of the bond.

    Args:
        scan: name of the scan.
        frames: the tables; what is missing besides ``points`` is left out.
        coordinate: name of the coordinate, without unit.

    Raises:
        ValueError: the tables hold no such scan.
    """
    points = frames["points"][frames["points"].scan == scan]
    if points.empty:
        raise ValueError(f"there is no scan {scan} in the tables")
    parts = {name: table[table.scan == scan] for name, table in frames.items() if "scan" in table}
    with mpl.rc_context(STYLE):
        return _draw(scan, parts, coordinate)


def _draw(scan: str, parts: Mapping[str, pd.DataFrame], coordinate: str) -> Figure:
    points, diagnostics, bond = (_table(parts, name) for name in ("points", "diagnostics", "bond_picture"))
    verdicts, comparison, onsets = (_table(parts, name) for name in ("verdicts", "comparison", "onsets"))
    names, levels = shown(diagnostics), looks(list(dict.fromkeys(points.level)))
    columns, why = _columns(levels), headline(verdicts)
    strip = len(levels) * ROW_INCHES + 0.1
    sizes = [_ENERGIES, strip, *[_PANEL] * len(names), *[_BOND] * has_bond_picture(bond)]
    top = _TITLE + _WHY_LINE * len(why.splitlines())
    figure, axes = _panels(sizes, top, -(-len(levels) // columns))
    handles = draw_energies(axes[0], points, levels)
    draw_trust(axes[1], verdicts, comparison, levels)
    for panel, name in zip(axes[2:], names, strict=False):
        here = onsets[onsets.diagnostic == name]
        draw_diagnostic(panel, diagnostics[diagnostics.diagnostic == name], levels, here)
    if has_bond_picture(bond):
        draw_bond(axes[-1], bond, levels)
    logarithmic = False
    for panel in axes:
        logarithmic = set_lengths(panel, points.coordinate_angstrom.to_numpy())
        panel.tick_params(labelbottom=panel is axes[-1])
    axes[-1].set_xlabel(label(coordinate, logarithmic))
    height = figure.get_figheight()
    figure.text(_LEFT / WIDTH, 1 - 0.24 / height, scan, fontsize=11, fontweight="bold", va="center")
    figure.text(_WHY_LEFT / WIDTH, 1 - _TITLE / height, why, fontsize=7.6, va="top", linespacing=1.25)
    below = _legend(figure, handles, top, columns, 3.2)
    marks = [*mark_handles(points), *trust_handles(comparison)]
    _legend(figure, marks, below + 0.02, len(marks), 1.2)
    return figure


def _table(parts: Mapping[str, pd.DataFrame], name: str) -> pd.DataFrame:
    """The part of a table that is about the scan; empty where there is no such table."""
    if name in parts:
        return parts[name]
    return pd.DataFrame({column.name: [] for column in COLUMNS[name]})


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


def _panels(sizes: Sequence[float], head: float, legend_rows: int) -> tuple[Figure, list[Axes]]:
    """Figure and its axes, from top to bottom, of the given heights in inches, below title and legend."""
    top = head + _LEGEND_ROW * (legend_rows + 1) + 0.12
    height = top + sum(sizes) + _GAP * (len(sizes) - 1) + _BOTTOM
    figure = blank(WIDTH, height)
    edges, at = [], height - top + _GAP
    for size in sizes:
        at -= size + _GAP
        edges.append(at)
    width = WIDTH - _LEFT - _RIGHT
    boxes = [
        (_LEFT / WIDTH, y / height, width / WIDTH, h / height) for y, h in zip(edges, sizes, strict=True)
    ]
    return figure, [figure.add_axes(box) for box in boxes]
