"""What the terminal shows at the end of a run."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from scission.analysis import Analysis
from scission.report.overview import CAUTION, best_constants, counts, failure_counts

_WIDEST = 60
_MOST_ROWS = 40


def summary_text(analysis: Analysis, folder: Path | None = None) -> str:
    """Counts, flags, fits and failures in small tables, and where the files are.

    Args:
        analysis: what the campaign came to.
        folder: results folder of the campaign, to be named at the end.
    """
    points, failures = analysis.frames["points"], analysis.frames["failures"]
    good = len(points) - len(failures)
    parts = [
        f"{analysis.campaign.name}: {len(points)} points, {good} with a result, {len(failures)} without",
        "Points and flags\n" + text_table(counts(points, analysis.frames["limits"])),
        "Fits (standard error in the last digits)\n" + text_table(_fits(analysis)),
    ]
    if len(failures):
        parts.append("Points without a result\n" + text_table(failure_counts(failures)))
    if analysis.mixed:
        parts.append(
            f"Caution: records differ in {', '.join(analysis.mixed)}; see provenance in report.html."
        )
    if folder is not None:
        parts.append(_places(folder, bool(len(failures))))
    return "\n\n".join([*parts, CAUTION])


def _fits(analysis: Analysis) -> pd.DataFrame:
    """The constants; remarks only where there are none, to keep the lines short."""
    table = best_constants(analysis.frames)
    if "models" not in table:
        return table
    return table.assign(remark=table["remark"].mask(table["models"] != "", ""))


def text_table(table: pd.DataFrame) -> str:
    """A table in fixed width: words to the left, numbers to the right, long words cut."""
    if table.empty:
        return "  (none)"
    shown = table.head(_MOST_ROWS)
    columns = [[str(name), *(_cell(value) for value in shown[name])] for name in shown]
    right = [pd.api.types.is_numeric_dtype(shown[name]) for name in shown]
    widths = [max(len(cell) for cell in column) for column in columns]
    lines = []
    for row in zip(*columns, strict=True):
        cells = [
            cell.rjust(width) if to_right else cell.ljust(width)
            for cell, width, to_right in zip(row, widths, right, strict=True)
        ]
        lines.append(("  " + "  ".join(cells)).rstrip())
    hidden = len(table) - len(shown)
    return "\n".join(lines + ([f"  ... and {hidden} more rows in the tables"] if hidden else []))


def _cell(value: object) -> str:
    text = f"{value:.4g}" if isinstance(value, float) else str(value)
    return text if len(text) <= _WIDEST else text[: _WIDEST - 4] + " ..."


def _places(folder: Path, failed: bool) -> str:
    places = {
        "page to look at": folder / "report.html",
        "tables": folder / "tables",
        "figures": folder / "figures",
        "every number": folder / "campaign.h5",
    }
    if failed:
        places["points to retry"] = folder / "failures.csv"
    width = max(len(what) for what in places)
    return "Files\n" + "\n".join(f"  {what.ljust(width)}  {path}" for what, path in places.items())
