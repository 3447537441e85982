"""The strip under the energies: from which length on each level is to be distrusted, at one look.

One row a level.  The bar is the flag (full: single-reference, grey: borderline, empty: multireference), the
line under it the interval within which the level keeps to the reference level.
"""

from __future__ import annotations

from collections.abc import Mapping
from textwrap import shorten

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from scission.report.style import Look

ROW_INCHES = 0.17
_BAR, _LINE_AT = 0.42, -0.34
_NAME_AT = -0.012
_WORST = ("multireference", "borderline")


def draw_trust(
    axes: Axes, verdicts: pd.DataFrame, comparison: pd.DataFrame, looks: Mapping[str, Look]
) -> None:
    """Draw flags and trusted intervals of all levels of one scan, in the order of the legend."""
    for row, (name, look) in enumerate(looks.items()):
        at = len(looks) - 1 - row
        _bars(axes, verdicts[verdicts.level == name], look, at)
        words = _interval(axes, comparison[comparison.level == name], look, at)
        axes.text(
            _NAME_AT, at, name, transform=axes.get_yaxis_transform(), ha="right", va="center", fontsize=8
        )
        axes.text(1.012, at, words, transform=axes.get_yaxis_transform(), va="center", fontsize=7.5)
    axes.set_ylim(-0.7, len(looks) - 0.4)
    axes.set_yticks([])


def _bars(axes: Axes, stretches: pd.DataFrame, look: Look, at: int) -> None:
    """One bar a stretch; stretches meet half way between their points."""
    ordered = stretches.sort_values("from_angstrom")
    starts, ends = ordered.from_angstrom.to_numpy(), ordered.to_angstrom.to_numpy()
    between = (starts[1:] + ends[:-1]) / 2.0
    lows, highs = np.concatenate([starts[:1], between]), np.concatenate([between, ends[-1:]])
    for low, high, flag in zip(lows, highs, ordered.flag, strict=True):
        axes.barh(
            at,
            max(high - low, 1e-3 * high),
            left=low,
            height=_BAR,
            facecolor=look.face(str(flag)),
            edgecolor=look.colour,
            linewidth=0.7,
        )


def _interval(axes: Axes, rows: pd.DataFrame, look: Look, at: int) -> str:
    """Draw the trusted interval; give the words for the right margin."""
    found = dict(zip(rows.quantity, rows["value"], strict=True))
    if "trusted_to" not in found:
        return ""
    ends = found["trusted_from"], found["trusted_to"]
    axes.plot(ends, [at + _LINE_AT] * 2, color=look.colour, linewidth=2.2, solid_capstyle="butt")
    axes.plot(ends, [at + _LINE_AT] * 2, "|", color=look.colour, markersize=5, markeredgewidth=1.2)
    why = dict(zip(rows.quantity, rows["what"], strict=True))
    beyond = "" if "too far" in why["trusted_to"] else "+"
    return f"to {ends[1]:.2f}{beyond}"


def trust_handles(comparison: pd.DataFrame) -> list[Line2D]:
    """Legend of the line, where some level was compared."""
    compared = comparison[comparison.quantity == "tolerance"]
    if compared.empty:
        return []
    words = f"trusted ({compared['value'].iloc[0]:g} kcal/mol)"
    return [Line2D([], [], color="#555555", linewidth=2.2, label=words)]


def headline(verdicts: pd.DataFrame, width: int = 125) -> str:
    """Where the flag changes outward of the well and why, in at most two lines, for the first level."""
    if verdicts.empty:
        return ""
    first = verdicts[verdicts.level == verdicts.level.iloc[0]].sort_values("from_angstrom")
    outward = first.iloc[int(np.argmax((first.flag == "single-reference").to_numpy())) :]
    said = [
        f"{flag} from {start:.2f} angstrom on: {three_reasons(reasons)}"
        for flag, start, reasons in zip(outward.flag, outward.from_angstrom, outward.reasons, strict=True)
        if flag in _WORST
    ]
    if not said:
        flags = ", ".join(dict.fromkeys(first.flag))
        return f"{flags} at every point"
    return "\n".join(shorten(words, width, placeholder=" ...") for words in said[:2])


def three_reasons(reasons: str) -> str:
    """The first three of some reasons."""
    return "; ".join(reasons.split("; ")[:3])
