"""Rows of words and numbers as aligned columns."""

from __future__ import annotations

from collections.abc import Sequence


def table(rows: Sequence[Sequence[str]], left: int = 2) -> str:
    """Return rows as columns: the first ``left`` ones to the left, numbers to the right."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    lines = []
    for row in rows:
        cells = [
            cell.ljust(width) if i < left else cell.rjust(width)
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)
