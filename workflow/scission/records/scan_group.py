"""One scan of campaign.h5: arrays over (level, point), and ragged ones a level."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING

import h5py
import numpy as np

from scission.records.labels import label
from scission.records.ragged import RaggedArray
from scission.records.recall import Planned, settled_scalars
from scission.records.schema import ARRAYS, POINT_TEXTS, SCALARS, TOO_LARGE_TO_GATHER, Field
from scission.records.store import Record

if TYPE_CHECKING:
    from scission.records.gather import Described

ATTEMPTS = Field("attempts", "i8", "1", (), "how often the calculation was started")
MISSING_INTEGER = -1

_TEXT = h5py.string_dtype("utf-8")
_NUMBERS = (*SCALARS, ATTEMPTS)
_RAGGED = {item.name: item for item in ARRAYS if item.name not in (*TOO_LARGE_TO_GATHER, "positions")}


class ScanGroup:
    """Collects the points of one scan and writes them below an HDF5 group.

    Args:
        group: the empty group of the scan.
        points: all planned points of the scan, every level on the same grid.
    """

    def __init__(self, group: h5py.Group, points: Sequence[Planned]) -> None:
        self.points = points
        self._group = group
        self._grid = {point.number: point for point in sorted(points, key=lambda p: p.number)}
        self._levels = list(dict.fromkeys(point.level for point in points))
        self._row = {level: row for row, level in enumerate(self._levels)}
        self._column = {number: column for column, number in enumerate(self._grid)}
        self._shape = (len(self._levels), len(self._grid))
        self._numbers = {item.name: self._blank(item.dtype) for item in _NUMBERS}
        self._texts = {item.name: np.full(self._shape, "", dtype=object) for item in POINT_TEXTS}
        self._diagnostics: dict[str, np.ndarray] = {}
        self._symbols: list[str] = []
        self._make_axes()

    def _blank(self, dtype: str) -> np.ndarray:
        return np.full(self._shape, np.nan if dtype == "f8" else MISSING_INTEGER, dtype=dtype)

    def _make_axes(self) -> None:
        group, first = self._group, next(iter(self._grid.values()))
        levels = scale(group, "level", np.array(self._levels, dtype=object), "level of theory")
        numbers = np.array(list(self._grid), dtype="i8")
        points = scale(group, "point", numbers, "number of the point along the scan")
        self._plane = [levels, points]  # kept: to look them up for every array takes a tenth of gather
        scale(group, "xyz", np.array(["x", "y", "z"], dtype=object), "Cartesian component")
        for index, meaning in enumerate(first.names):
            name = "coordinate_angstrom" if index == 0 else f"coordinate_{index + 1}_angstrom"
            values = [point.coordinate[index] for point in self._grid.values()]
            item = Field(name, "f8", "angstrom", (), meaning)
            describe(group.create_dataset(name, data=values), item, [points])
        self._positions = RaggedArray(group, "positions", len(self._grid))
        self._ragged: dict[tuple[str, str], RaggedArray] = {}

    def add(self, point: Planned, record: Record, flag: tuple[str, str]) -> None:
        """Take over the numbers and words of one point."""
        column = self._column[point.number]
        place = self._row[point.level], column
        for name, value in (settled_scalars(record) | {"attempts": record.attempts}).items():
            if math.isfinite(value):  # an integer array has no place for NaN
                self._numbers[name][place] = value
        for name, value in record.diagnostics.items():
            if name not in self._diagnostics:
                self._diagnostics[name] = self._blank("f8")
            self._diagnostics[name][place] = value
        words = {"flag": flag[0], "reasons": flag[1]}
        for name, column_of in self._texts.items():
            column_of[place] = words[name] if name in words else getattr(record, name)
        self._add_arrays(point.level, column, record)

    def _add_arrays(self, level: str, column: int, record: Record) -> None:
        for name, array in record.arrays.items():
            if name == "positions":
                self._positions.put(column, array)
                self._symbols = self._symbols or symbols_of(record)
            elif name in _RAGGED and record.status == "converged":
                if (level, name) not in self._ragged:
                    home = self._group.require_group(f"levels/{level}")
                    self._ragged[level, name] = RaggedArray(home, name, len(self._grid))
                self._ragged[level, name].put(column, array)

    def finish(self, diagnostics: Mapping[str, Described]) -> None:
        """Write what was collected, with units, meanings and axes."""
        for item in _NUMBERS:
            self._write(item, self._numbers[item.name])
        for item in POINT_TEXTS:
            self._write(item, self._texts[item.name])
        for name, values in self._diagnostics.items():
            known = diagnostics.get(name)
            item = Field(name, "f8", known.unit if known else "", (), known.meaning if known else name)
            dataset = self._write(item, values)
            label(dataset, source=known.source if known else "")
        self._finish_arrays()

    def _write(self, item: Field, values: np.ndarray) -> h5py.Dataset:
        dtype = _TEXT if item.dtype == "str" else item.dtype
        dataset = self._group.create_dataset(item.name, data=values, dtype=dtype)
        describe(dataset, item, self._plane)
        label(dataset, coordinates="coordinate_angstrom")
        if item.dtype == "i8" and item is not ATTEMPTS:  # attempts are known of every point
            dataset.attrs["_FillValue"] = np.int64(MISSING_INTEGER)
        return dataset

    def _finish_arrays(self) -> None:
        n_atoms = self._positions.shape[1:2]
        if n_atoms:
            symbols = self._symbols if (len(self._symbols),) == n_atoms else ["?"] * n_atoms[0]
            labels = [f"{symbol}{number}" for number, symbol in enumerate(symbols, start=1)]
            scale(self._group, "atom", np.array(labels, dtype=object), "atom, element and number")
            element = self._group.create_dataset("element", data=np.array(symbols, dtype=object), dtype=_TEXT)
            describe(element, Field("element", "str", "1", (), "element symbol"), [self._group["atom"]])
            known = next(item for item in ARRAYS if item.name == "positions")
            self._positions.finish(known, self._axes(self._group, known, self._positions))
        for (level, name), array in self._ragged.items():
            home = self._group[f"levels/{level}"]
            array.finish(_RAGGED[name], self._axes(home, _RAGGED[name], array))

    def _axes(self, home: h5py.Group, item: Field, array: RaggedArray) -> list[h5py.Dataset]:
        axes = [self._plane[1]]
        for name, size in zip(item.shape, array.shape[1:], strict=True):
            if name in ("atom", "xyz"):
                axes.append(self._group[name])
                continue
            label = name if name not in home or len(home[name]) == size else f"{name}_of_{item.name}"
            if label not in home:
                scale(home, label, np.arange(1, size + 1), f"number of the {name}, from 1")
            axes.append(home[label])
        return axes


def symbols_of(record: Record) -> list[str]:
    """Element symbols that the record's inputs state, under ``symbols`` or ``molecule.symbols``."""
    inputs = record.inputs
    return [str(item) for item in inputs.get("symbols") or inputs.get("molecule", {}).get("symbols", [])]


def scale(group: h5py.Group, name: str, values: np.ndarray, meaning: str) -> h5py.Dataset:
    """Write a labelled axis (an HDF5 dimension scale) and return it."""
    dtype = _TEXT if values.dtype == object else values.dtype
    dataset = group.create_dataset(name, data=values, dtype=dtype)
    dataset.make_scale(name)
    label(dataset, long_name=meaning)
    return dataset


def describe(dataset: h5py.Dataset, item: Field, axes: Sequence[h5py.Dataset]) -> None:
    """Attach unit, meaning and axes to an array."""
    label(dataset, units=item.unit, long_name=item.meaning)
    for index, axis in enumerate(axes):
        dataset.dims[index].attach_scale(axis)
