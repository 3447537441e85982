"""Several campaigns as one, and two side by side."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from functools import cached_property
from pathlib import Path

import pandas as pd
import xarray as xr

from scission.handover.extxyz import write_extxyz
from scission.handover.opened import OpenCampaign, Shelf, Tabled, described
from scission.tables import COLUMNS, Column
from scission.units import HARTREE_IN_KCAL_PER_MOL

CAMPAIGN = Column("campaign", "str", "1", "name of the campaign")

_SAME_ANGSTROM = 6
"""Decimals to which two lengths must agree to be one point of a comparison."""


class Campaigns(Tabled):
    """Some campaigns as one: tables with a first column ``campaign``, scans as ``campaign/scan``.

    Raises:
        ValueError: none are given, or two have the same name.
    """

    def __init__(self, members: Sequence[OpenCampaign]) -> None:
        twice = [name for name, n in Counter(c.name for c in members).items() if n > 1]
        if not members or twice:
            raise ValueError(
                f"campaigns need names that differ; twice: {', '.join(twice)}" if members else "no campaigns"
            )
        self.members = tuple(members)

    @cached_property
    def tables(self) -> Shelf[pd.DataFrame]:
        """Every table that any member has."""
        names = [name for name in COLUMNS if any(name in c.tables for c in self.members)]
        return Shelf(names, self._read)

    @cached_property
    def scans(self) -> Shelf[xr.Dataset]:
        """Every scan of every campaign."""
        found = {f"{c.name}/{scan}": (c, scan) for c in self.members for scan in c.scans}
        return Shelf(list(found), lambda name: found[name][0].scans[found[name][1]])

    def write_extxyz(self, path: Path | str) -> int:
        """Write all geometries with energies and flags to one file; return how many."""
        return write_extxyz(self.members, Path(path))

    def _read(self, name: str) -> pd.DataFrame:
        parts = []
        for member in self.members:
            if name in member.tables:
                part = member.tables[name].copy()
                part.insert(0, CAMPAIGN.name, pd.Series([member.name] * len(part), dtype="str"))
                parts.append(part)
        return described(pd.concat(parts, ignore_index=True), (CAMPAIGN, *COLUMNS[name]))


def concat(campaigns: Sequence[OpenCampaign]) -> Campaigns:
    """Return several campaigns as one.

    Raises:
        ValueError: none are given, or two have the same name.
    """
    return Campaigns(campaigns)


def compare(first: OpenCampaign, second: OpenCampaign) -> pd.DataFrame:
    """Return the points that either campaign has, matched by scan, level and length, and how they differ.

    Columns: scan, level, coordinate_angstrom; status, flag and energy_hartree of each with the suffixes
    _first and _second; difference_kcal_per_mol (second less first; NaN where either has no energy).
    """
    on = ["scan", "level", "coordinate_angstrom"]
    kept = [*on, "status", "flag", "energy_hartree"]
    sides = [
        c.points[kept].assign(coordinate_angstrom=c.points["coordinate_angstrom"].round(_SAME_ANGSTROM))
        for c in (first, second)
    ]
    both = sides[0].merge(sides[1], on=on, how="outer", suffixes=("_first", "_second"))
    step = both["energy_hartree_second"] - both["energy_hartree_first"]
    return both.assign(difference_kcal_per_mol=step * HARTREE_IN_KCAL_PER_MOL)
