"""The lower panels: each diagnostic against its threshold, with the side that is over shaded."""

from __future__ import annotations

from collections.abc import Mapping
from textwrap import fill

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.ticker import MaxNLocator
from matplotlib.transforms import ScaledTranslation

from scission.diagnostics import DIAGNOSTICS
from scission.report.style import INK, OVER_SHADE, THRESHOLD_DASHES, Look
from scission.thresholds.rule import AGREEING, RULE

MIRRORED = {"hono": "luno", "uhf_hono": "uhf_luno", "cc_hono": "cc_luno"}
"""Occupations that add up to two with another one's for a broken pair: drawn only without the other."""

MOST = 8

_SPAN = 40.0
_SAME_PLACE = 0.03
_TRIVIAL = 1e-8
_NAME_AT_INCHES = -0.5


def shown(diagnostics: pd.DataFrame) -> list[str]:
    """Diagnostics to draw, in the order of the registry: those that decide, and the weightiest that are over.

    At most ``MOST`` panels stay readable; all others are in the tables.
    """
    usable = diagnostics.dropna(subset=["value", "threshold"])
    over = set(usable[usable.over.fillna(False).astype(bool)].diagnostic)
    names = [name for name in DIAGNOSTICS if name in set(usable.diagnostic)]
    names = [name for name in names if MIRRORED.get(name) not in names]
    weight = {name: RULE.weight(name) for name in names}
    wanted = [name for name in names if weight[name] >= AGREEING or name in over]
    kept = sorted(wanted, key=lambda name: -weight[name])[:MOST]
    return [name for name in names if name in kept]


def draw_diagnostic(
    axes: Axes, rows: pd.DataFrame, looks: Mapping[str, Look], onsets: pd.DataFrame | None = None
) -> None:
    """Draw one diagnostic of all levels that have it, and where it crosses its threshold.

    One that is zero by its form says nothing.
    """
    rows = rows.dropna(subset=["value"])
    bound, above = float(rows.threshold.iloc[0]), rows.direction.iloc[0] == "above"
    low, high = _limits(rows.value.to_numpy(), bound, above)
    for name, look in looks.items():
        level = rows[rows.level == name].sort_values("coordinate_angstrom")
        if (level.value.abs() < _TRIVIAL).all():
            continue
        axes.plot(
            level.coordinate_angstrom,
            np.clip(level.value, low, high),
            linestyle=look.line,
            color=look.colour,
            linewidth=1.1,
            marker=look.marker,
            markersize=2.6,
        )
    axes.set_ylim(low, high)
    axes.axhspan(bound, high if above else low, facecolor=OVER_SHADE, zorder=0)
    axes.axhline(bound, color=INK, linewidth=0.9, linestyle=THRESHOLD_DASHES, zorder=1)
    axes.yaxis.set_major_locator(MaxNLocator(3))
    axes.tick_params(axis="y", labelsize=7.5)
    sign = ">" if above else "<"
    axes.text(
        1.012, bound, f"{sign} {bound:g}", transform=axes.get_yaxis_transform(), va="center", fontsize=8
    )
    _name(axes, rows)
    if onsets is not None:
        _mark_onsets(axes, onsets.dropna(subset=["onset_angstrom"]), looks)


def _mark_onsets(axes: Axes, onsets: pd.DataFrame, looks: Mapping[str, Look]) -> None:
    """A line and the length at the first crossing; levels that agree on it share one."""
    drawn: list[float] = []
    for name, look in looks.items():
        for place in onsets[onsets.level == name].onset_angstrom.head(1):
            if any(abs(place / other - 1.0) < _SAME_PLACE for other in drawn):
                continue
            side = "right" if len(drawn) % 2 == 0 else "left"
            drawn.append(float(place))
            axes.axvline(place, color=look.colour, linewidth=0.7, linestyle=(0, (1, 1.5)), zorder=1)
            axes.annotate(
                f"{place:.2f}",
                (place, 0.97),
                xycoords=axes.get_xaxis_transform(),
                xytext=(-2 if side == "right" else 2, 0),
                textcoords="offset points",
                ha=side,
                va="top",
                fontsize=7,
                color=look.colour,
            )


def _name(axes: Axes, rows: pd.DataFrame) -> None:
    symbol, unit = rows.symbol.iloc[0], rows.unit.iloc[0]
    text = symbol if unit in ("", "1") else f"{symbol} / {unit}"
    place = axes.transAxes + ScaledTranslation(_NAME_AT_INCHES, 0, axes.figure.dpi_scale_trans)
    axes.text(0, 0.5, fill(text, 13), transform=place, ha="right", va="center", fontsize=8.5, linespacing=1.0)


def _limits(values: np.ndarray, bound: float, above: bool) -> tuple[float, float]:
    """Range of the panel: all values, but not farther beyond the threshold than tells something."""
    low, high = min(values.min(), bound), max(values.max(), bound)
    if bound > 0 and above:
        high = min(high, _SPAN * bound)
    margin = 0.1 * (high - low) or 0.1
    return float(low - margin), float(high + margin)
