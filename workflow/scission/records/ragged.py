"""An HDF5 array along the points of a scan whose rows may differ in size: it grows, NaN fills the rest."""

from __future__ import annotations

from collections.abc import Sequence

import h5py
import numpy as np

from scission.records.labels import label
from scission.records.schema import Field

_BLOCK = 128


class RaggedArray:
    """Rows of one named array, written in blocks so that memory stays flat.

    Args:
        group: where the dataset is made when the first row arrives.
        name: its name.
        n_points: length of the first axis.
    """

    def __init__(self, group: h5py.Group, name: str, n_points: int) -> None:
        self._group = group
        self._name = name
        self._n_points = n_points
        self._waiting: dict[int, np.ndarray] = {}
        self._dataset: h5py.Dataset | None = None

    @property
    def shape(self) -> tuple[int, ...]:
        """(n_points, largest row so far ...); empty if no row has come."""
        self._finish_rows()
        return self._dataset.shape if self._dataset is not None else ()

    def put(self, index: int, row: np.ndarray) -> None:
        """Keep ``row`` for point ``index``, counted from 0; the last one given counts."""
        self._waiting[index] = np.asarray(row, dtype="f8")
        if len(self._waiting) >= _BLOCK:
            self._flush()

    def finish(self, item: Field, axes: Sequence[h5py.Dataset]) -> None:
        """Attach unit, meaning and axes once all rows are there."""
        self._finish_rows()
        if self._dataset is None:
            return
        label(self._dataset, units=item.unit, long_name=item.meaning)
        for index, axis in enumerate(axes):
            self._dataset.dims[index].attach_scale(axis)

    def _finish_rows(self) -> None:
        if self._dataset is not None or not self._waiting:
            self._flush()
            return
        # All rows are in memory: written in one piece, which costs a third of one that grows.
        block = np.full((self._n_points, *self._sizes()), np.nan)
        self._lay(block, 0)
        self._dataset = self._group.create_dataset(self._name, data=block, fillvalue=np.nan)

    def _flush(self) -> None:
        if not self._waiting:
            return
        dataset = self._grown(self._sizes())
        low, high = min(self._waiting), max(self._waiting) + 1
        block = dataset[low:high]
        self._lay(block, low)
        dataset[low:high] = block

    def _sizes(self) -> tuple[int, ...]:
        return tuple(int(size) for size in np.max([row.shape for row in self._waiting.values()], axis=0))

    def _lay(self, block: np.ndarray, low: int) -> None:
        """Lay the waiting rows into ``block``, whose first row is number ``low``."""
        for index, row in self._waiting.items():
            block[index - low] = np.nan
            block[index - low][tuple(slice(size) for size in row.shape)] = row
        self._waiting.clear()

    def _grown(self, sizes: tuple[int, ...]) -> h5py.Dataset:
        if self._dataset is None:
            self._dataset = self._group.create_dataset(
                self._name,
                shape=(self._n_points, *sizes),
                maxshape=(self._n_points, *[None] * len(sizes)),
                chunks=(min(self._n_points, _BLOCK), *(max(size, 1) for size in sizes)),
                dtype="f8",
                fillvalue=np.nan,
            )
        wanted = (self._n_points, *np.maximum(self._dataset.shape[1:], sizes))
        self._dataset.resize(wanted)
        return self._dataset
