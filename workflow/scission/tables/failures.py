"""The failure list as an input: a file that a person may have edited, by hand or in a spreadsheet."""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass
from pathlib import Path

NEEDED = ("scan", "level", "point")

_LARGEST_FILE = 200_000_000  # bytes; a million rows are about half of it
_SHOWN = 20


class FailureListError(ValueError):
    """The failure list cannot be used; the message names every line and column at fault."""


@dataclass(frozen=True)
class FailureRow:
    """One point to compute again, as the file states it.

    ``coordinate_angstrom`` is None and the texts are empty where the file has no such column.
    """

    line: int
    scan: str
    level: str
    point: int
    coordinate_angstrom: float | None = None
    remedy: str = ""
    key: str = ""
    status: str = ""
    reason: str = ""


def read_failures(path: Path) -> list[FailureRow]:
    """Rows of a failure list; rows may be deleted, columns reordered, added or, but for three, left out.

    Needed are the columns scan, level and point.

    Raises:
        FailureListError: with all problems, each with its line and column.
        OSError: the file cannot be read.
    """
    reader = csv.reader(_text(path).splitlines(keepends=True), strict=True)
    try:
        rows = [(reader.line_num, row) for row in reader if any(cell.strip() for cell in row)]
    except csv.Error as error:
        raise FailureListError(f"{path}, line {reader.line_num}: {error}") from None
    if not rows:
        raise FailureListError(f"{path}: the file is empty; its first line must name the columns")
    header = _header(path, rows[0][1])
    problems: list[str] = []
    found = [row for line, cells in rows[1:] if (row := _row(line, header, cells, problems))]
    problems += _repeated(found)
    if problems:
        more = [f"... and {len(problems) - _SHOWN} more"] if len(problems) > _SHOWN else []
        raise FailureListError("\n".join([f"{path}, {item}" for item in problems[:_SHOWN]] + more))
    return found


def _text(path: Path) -> str:
    if path.stat().st_size > _LARGEST_FILE:
        raise FailureListError(
            f"{path}: larger than {_LARGEST_FILE // 1_000_000} MB, this is no failure list"
        )
    data = path.read_bytes()
    if data.startswith((b"\xff\xfe", b"\xfe\xff")) or b"\0" in data:
        raise FailureListError(f"{path}: is UTF-16 or binary; save it as 'CSV UTF-8 (comma delimited)'")
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise FailureListError(f"{path}, line {line}: not UTF-8; save it as 'CSV UTF-8'") from None


def _header(path: Path, cells: list[str]) -> list[str]:
    names = [cell.strip() for cell in cells]
    missing = [name for name in NEEDED if name not in names]
    for mark, word in ((";", "semicolons"), ("\t", "tabs")):
        if missing and any(mark in cell for cell in cells):
            raise FailureListError(
                f"{path}, line 1: the columns are separated by {word}; save it with commas and dot decimals"
            )
    if missing:
        raise FailureListError(
            f"{path}, line 1: no column {', '.join(missing)}; needed are {', '.join(NEEDED)}, found {names}"
        )
    twice = sorted({name for name in names if name and names.count(name) > 1})
    if twice:
        raise FailureListError(f"{path}, line 1: column {', '.join(twice)} is there twice")
    return names


def _row(line: int, header: list[str], cells: list[str], problems: list[str]) -> FailureRow | None:
    extra = [cell for cell in cells[len(header) :] if cell.strip()]
    if extra:
        problems.append(f"line {line}: {len(cells)} cells, but the first line names {len(header)} columns")
        return None
    values = {name: cell.strip() for name, cell in zip(header, cells, strict=False)}
    before = len(problems)
    empty = [name for name in ("scan", "level") if not values.get(name)]
    problems.extend(f"line {line}, column {name}: is empty" for name in empty)
    point = _whole_number(line, values.get("point", ""), problems)
    coordinate = _length(line, values.get("coordinate_angstrom", ""), problems)
    if len(problems) > before:
        return None
    words = {name: values.get(name, "") for name in ("remedy", "key", "status", "reason")}
    return FailureRow(line, values["scan"], values["level"], point, coordinate, **words)


def _whole_number(line: int, text: str, problems: list[str]) -> int:
    if text.isascii() and text.isdigit() and 0 < len(text) < 10 and int(text) > 0:
        return int(text)
    problems.append(f"line {line}, column point: {text!r} is not a whole number from 1")
    return 0


def _length(line: int, text: str, problems: list[str]) -> float | None:
    try:
        value = float(text) if text else None
    except ValueError:
        value = math.nan
    if value is not None and not math.isfinite(value):
        problems.append(
            f"line {line}, column coordinate_angstrom: {text!r} is not a number with a dot decimal"
        )
    return value


def _repeated(rows: list[FailureRow]) -> list[str]:
    first: dict[tuple[str, str, int], int] = {}
    problems = []
    for row in rows:
        at = first.setdefault((row.scan, row.level, row.point), row.line)
        if at != row.line:
            problems.append(
                f"line {row.line}: point {row.point} of {row.scan}, {row.level} is in line {at} already"
            )
    return problems
