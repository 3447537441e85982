"""All records of a campaign in one self-describing HDF5 file, campaign.h5.

Layout, with HDF5 dimension scales so that every array comes with labelled axes::

    scans/<scan>                 axes level, point; coordinate_angstrom along point
        energy, ..., t1, ...     (level, point)  every scalar of the schema, every diagnostic
        status, flag, ...        (level, point)  words
        positions                (point, atom, xyz)
        levels/<level>           arrays whose length depends on the level:
            natural_occupations  (point, orbital), state_energies (point, state) ...

The root carries the provenance as attributes.  Numbers are in hartree, bohr and the other units
that each array's ``units`` attribute names; missing values are NaN (-1 for integers).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from itertools import groupby
from pathlib import Path
from typing import Any, Protocol

import h5py

from scission.records.atomic import replacing
from scission.records.recall import Planned, recall_point
from scission.records.scan_group import ScanGroup
from scission.records.schema import ARRAYS, SCHEMA_VERSION, TOO_LARGE_TO_GATHER
from scission.records.store import Store

Flags = Mapping[tuple[str, str, int], tuple[str, str]]

_ARRAY_NAMES = tuple(item.name for item in ARRAYS if item.name not in TOO_LARGE_TO_GATHER)
_LIBVER = ("v108", "v110")  # 1.8 is the oldest that takes an attribute above 64 KiB: the campaign file


class Described(Protocol):
    """What is asked of a member of the diagnostics registry."""

    @property
    def unit(self) -> str: ...
    @property
    def meaning(self) -> str: ...
    @property
    def source(self) -> str: ...


def gather(
    points: Iterable[Planned],
    store: Store,
    out: Path,
    provenance: Mapping[str, Any],
    diagnostics: Mapping[str, Described] | None = None,
    flags: Flags | None = None,
) -> None:
    """Stream the records of all planned points into ``out``, which appears whole or not at all.

    One record is in memory at a time, and of one scan the scalars.  A point without a record gets
    a row with status ``lost``.

    Args:
        points: planned points in any order; all levels of a scan share its grid.
        provenance: name to text or number, for the attributes of the root.
        diagnostics: the registry, for unit, meaning and source of each diagnostic.
        flags: (scan, level, number) to (flag, reasons in words).

    Raises:
        OSError: ``out`` cannot be written; an earlier file there is unchanged.
    """
    ordered = sorted(points, key=lambda point: point.scan)
    with replacing(out) as temporary, h5py.File(temporary, "w", libver=_LIBVER) as file:
        file.attrs["layout_version"] = SCHEMA_VERSION
        file.attrs.update({name: value for name, value in provenance.items() if value is not None})
        scans = file.create_group("scans")
        for name, members in groupby(ordered, key=lambda point: point.scan):
            _fill(ScanGroup(scans.create_group(name), list(members)), store, diagnostics or {}, flags or {})


def _fill(group: ScanGroup, store: Store, diagnostics: Mapping[str, Described], flags: Flags) -> None:
    for point in group.points:
        record = recall_point(store, point, _ARRAY_NAMES)
        flag = flags.get((point.scan, point.level, point.number), ("", ""))
        group.add(point, record, flag)
    group.finish(diagnostics)
