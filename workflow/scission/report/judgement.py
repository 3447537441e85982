"""For the page: from where on to distrust which level, and how well diagnostics foretold it."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd

from scission.report.canvas import STYLE, Figure, blank, mpl
from scission.report.style import INK, looks
from scission.report.trust import three_reasons
from scission.thresholds.rule import LABELS

_ROW, _HEAD, _FOOT, _WIDTH = 0.2, 0.75, 0.55, 8.0
_LEFT, _RIGHT = 1.75, 2.3

SCORECARD = "scorecard"
"""Name of the figure file; scans cannot be called so, as the figure would replace theirs."""


def distrust(frames: Mapping[str, pd.DataFrame]) -> pd.DataFrame:
    """One row a scan and level: trusted interval, first borderline and multireference length, reasons."""
    rows = []
    for (scan, level), part in frames["verdicts"].groupby(["scan", "level"], sort=False):
        found = frames["comparison"]
        found = found[(found.scan == scan) & (found.level == level)].set_index("quantity")
        rows.append({"scan": scan, "level": level} | _interval(found) | _flags(part))
    return pd.DataFrame(rows)


def _interval(found: pd.DataFrame) -> dict[str, object]:
    if "trusted_to" not in found.index:
        words = "" if found.empty else str(found["what"].iloc[0])
        return {"trusted / angstrom": words, "NPE / (kcal/mol)": ""}
    low, high = found["value"]["trusted_from"], found["value"]["trusted_to"]
    why = f"{low:.2f} to {high:.2f}; {found['what']['trusted_to']}"
    return {"trusted / angstrom": why, "NPE / (kcal/mol)": f"{found['value']['npe']:.3g}"}


def _flags(part: pd.DataFrame) -> dict[str, object]:
    ordered = part.sort_values("from_angstrom")
    outward = ordered.iloc[int(np.argmax((ordered.flag == "single-reference").to_numpy())) :]
    row: dict[str, object] = {}
    reasons = ""
    for flag in ("borderline", "multireference"):
        first = outward[outward.flag == flag].head(1)
        row[f"{flag} from / angstrom"] = "" if first.empty else f"{first.from_angstrom.iloc[0]:.2f}"
        reasons = reasons if first.empty else str(first.reasons.iloc[0])
    return row | {"reasons there": _first_three(reasons)}


def _first_three(reasons: str) -> str:
    """The first three reasons, and how many more there are: a dozen would make a column of one word a line."""
    told = three_reasons(reasons)
    left = reasons.count("; ") - told.count("; ")
    return f"{told}; and {left} more" if left else told


def onset_table(onsets: pd.DataFrame) -> pd.DataFrame:
    """One row a scan and diagnostic: first onset at each level, angstrom, empty where there is none."""
    known = onsets.dropna(subset=["onset_angstrom"])
    if known.empty:
        return known
    first = known.groupby(["scan", "diagnostic", "level"], sort=False).onset_angstrom.first().unstack()
    words = first.map(lambda value: f"{value:.3f}" if np.isfinite(value) else "")
    return words.reset_index().rename_axis(columns=None)


def score_table(scorecard: pd.DataFrame) -> pd.DataFrame:
    """The scorecard in words that fit a page."""
    columns = {
        "level": "error of",
        "diagnostic": "diagnostic",
        "threshold": "threshold",
        "hits": "hits",
        "misses": "misses",
        "false_alarms": "false alarms",
        "skill": "skill",
        "best_threshold": "best threshold",
        "best_skill": "its skill",
        "late_angstrom": "late by / angstrom",
        "scans": "scans",
    }
    ordered = scorecard.sort_values(["level", "skill"], ascending=[True, False], kind="stable")
    table = ordered[list(columns)].rename(columns=columns)
    for name in ("threshold", "skill", "best threshold", "its skill", "late by / angstrom"):
        table[name] = [f"{value:.3g}" if np.isfinite(value) else "" for value in table[name]]
    return table


def draw_scorecard(scorecard: pd.DataFrame) -> Figure:
    """How late each diagnostic warned: onset less end of the trusted interval, mean and range over scans.

    Left of zero is in time.  The numbers on the right are hits, misses and false alarms.
    """
    table = scorecard.dropna(subset=["late_angstrom"]).sort_values(["level", "late_angstrom"], kind="stable")
    levels = looks(list(dict.fromkeys(table.level)))
    with mpl.rc_context(STYLE):
        height = _HEAD + _ROW * max(len(table), 1) + _FOOT
        figure = blank(_WIDTH, height)
        box = (_LEFT / _WIDTH, _FOOT / height, 1 - (_LEFT + _RIGHT) / _WIDTH, 1 - (_HEAD + _FOOT) / height)
        axes = figure.add_axes(box)
        for at, row in enumerate(table.to_dict("records")):
            look = levels[row["level"]]
            ends = [row["earliest_angstrom"], row["latest_angstrom"]]
            axes.plot(ends, [at, at], color=look.colour, linewidth=1.4)
            axes.plot([row["late_angstrom"]], [at], look.marker, color=look.colour, markersize=5)
            words = f"{row['level']}: {row['hits']} / {row['misses']} / {row['false_alarms']}"
            axes.text(1.02, at, words, transform=axes.get_yaxis_transform(), va="center", fontsize=8)
        axes.axvline(0.0, color=INK, linewidth=0.8)
        axes.set_yticks(range(len(table)), [LABELS.get(name, name) for name in table.diagnostic])
        axes.set_ylim(-0.7, max(len(table), 1) - 0.3)
        axes.set_xlabel("onset less end of the trusted interval / angstrom (left: warns in time)")
        figure.text(
            1 - _RIGHT / _WIDTH + 0.01,
            1 - (_HEAD - 0.1) / height,
            "hits / misses / false alarms",
            fontsize=8,
        )
        figure.text(_LEFT / _WIDTH, 1 - 0.25 / height, "How diagnostics foretold errors", fontweight="bold")
    return figure
