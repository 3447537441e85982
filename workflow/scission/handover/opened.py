"""One finished campaign: its tables as pandas frames, its scans as xarray datasets."""

from __future__ import annotations

from abc import ABC, abstractmethod
from collections.abc import Callable, Iterator, Mapping
from functools import cached_property
from pathlib import Path
from typing import Any, Generic, TypeVar

import h5py
import pandas as pd
import xarray as xr

from scission.handover.extxyz import write_extxyz
from scission.tables import COLUMNS, Column

Content = TypeVar("Content")


class Shelf(Mapping[str, Content], Generic[Content]):
    """Named things that are read when they are asked for the first time."""

    def __init__(self, names: list[str], read: Callable[[str], Content]) -> None:
        self._names, self._read = names, read
        self._kept: dict[str, Content] = {}

    def __getitem__(self, name: str) -> Content:
        if name not in self._names:
            raise KeyError(f"{name!r}; there are {', '.join(self._names) or 'none'}")
        if name not in self._kept:
            self._kept[name] = self._read(name)
        return self._kept[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._names)

    def __len__(self) -> int:
        return len(self._names)


class Tabled(ABC):
    """What has tables: the ones asked for most by a name of their own."""

    @property
    @abstractmethod
    def tables(self) -> Shelf[pd.DataFrame]:
        """Every table by name, the failure list among them."""

    @property
    def points(self) -> pd.DataFrame:
        """One row for every planned point."""
        return self.tables["points"]

    @property
    def failures(self) -> pd.DataFrame:
        """The points without a result, with reason and suggested remedy."""
        return self.tables["failures"]


class OpenCampaign(Tabled):
    """What a campaign has given so far; nothing is read before it is asked for.

    Attributes:
        folder: results/<campaign>.
        name: name of the campaign.
        tables: table name to frame; ``frame.attrs["units"]`` and ``["meanings"]`` by column.
        scans: scan name to dataset with axes level, point, atom, xyz and ``units`` on every array.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.name = folder.name

    def __repr__(self) -> str:
        return f"<campaign {self.name}: {len(self.scans)} scans, {len(self.points)} points>"

    @cached_property
    def tables(self) -> Shelf[pd.DataFrame]:
        """Every table of the campaign, by name, the failure list among them."""
        there = [name for name in COLUMNS if self._table_file(name).is_file()]
        return Shelf(there, self._read_table)

    @cached_property
    def scans(self) -> Shelf[xr.Dataset]:
        """Every scan as a labelled dataset, numbers in the units that each array names."""
        with h5py.File(self.file) as file:
            names = list(file["scans"])
        return Shelf(names, lambda name: xr.load_dataset(self.file, engine="h5netcdf", group=f"scans/{name}"))

    def level(self, scan: str, level: str) -> xr.Dataset:
        """Return the arrays of one level whose size is its own: occupations, energies of states ...

        Raises:
            KeyError: the scan has no such level.
        """
        whole = self.scans[scan]
        if level not in whole["level"].values:
            raise KeyError(f"{level!r}; {scan} has {', '.join(map(str, whole['level'].values))}")
        with h5py.File(self.file) as file:
            if level not in file[f"scans/{scan}"].get("levels", {}):
                return xr.Dataset(coords={"point": whole["point"]})
        group = f"scans/{scan}/levels/{level}"
        return xr.load_dataset(self.file, engine="h5netcdf", group=group).assign_coords(point=whole["point"])

    @cached_property
    def provenance(self) -> dict[str, Any]:
        """Versions, times, hosts and the campaign file behind the numbers."""
        with h5py.File(self.file) as file:
            return {name: getattr(value, "item", lambda v=value: v)() for name, value in file.attrs.items()}

    @property
    def file(self) -> Path:
        """The file that holds every number."""
        return self.folder / "campaign.h5"

    def write_extxyz(self, path: Path | str) -> int:
        """Write all geometries at all levels with energies and flags; return how many.

        See :func:`scission.handover.extxyz.write_extxyz`.
        """
        return write_extxyz([self], Path(path))

    def _table_file(self, name: str) -> Path:
        folder = self.folder if name == "failures" else self.folder / "tables"
        return folder / f"{name}.csv"

    def _read_table(self, name: str) -> pd.DataFrame:
        path = self._table_file(name)
        if path.with_suffix(".parquet").is_file():  # the same content, many times faster to read
            table = pd.read_parquet(path.with_suffix(".parquet"))
        else:
            table = pd.read_csv(path, keep_default_na=False, na_values=_no_words(name))
        known = {c.name: c.pandas_dtype for c in COLUMNS[name] if c.name in table.columns}
        return described(table.astype(known), COLUMNS[name])


def _no_words(name: str) -> dict[str, list[str]]:
    """Return what stands for missing: nothing, but not in columns of words, where it is an empty word."""
    return {column.name: [""] for column in COLUMNS[name] if column.dtype != "str"}


def described(table: pd.DataFrame, columns: tuple[Column, ...]) -> pd.DataFrame:
    """Attach units and meanings of its columns to a frame."""
    known = [column for column in columns if column.name in table.columns]
    table.attrs["units"] = {column.name: column.unit for column in known}
    table.attrs["meanings"] = {column.name: column.meaning for column in known}
    return table


def open_campaign(where: Path | str) -> OpenCampaign:
    """Return a campaign by its results folder (results/<campaign>) or the campaign.h5 in it.

    Raises:
        FileNotFoundError: there is nothing to open; says what was looked for.
    """
    given = Path(where).expanduser()
    folder = given.parent if given.name == "campaign.h5" else given
    missing = [name for name in ("campaign.h5", "tables/points.csv") if not (folder / name).is_file()]
    if missing:
        raise FileNotFoundError(
            f"{folder}: no {' and no '.join(missing)}; give the folder results/<campaign> of a campaign "
            "that has been run to its tables"
        )
    return OpenCampaign(folder.absolute())
