"""All geometries of a campaign as extended XYZ, the common format of atomistic programs.

One frame a point and level: number of atoms; a line of key=value pairs; element and position in angstrom
of each atom.  ``energy`` is in eV, as programs that read the format expect; ``energy_hartree`` is the
number as computed.  Both are left out where the point has no energy.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
import xarray as xr

from scission.records.atomic import replacing
from scission.units import BOHR_IN_ANGSTROM, HARTREE_IN_EV

if TYPE_CHECKING:
    from scission.handover.opened import OpenCampaign

_WORDS = ("status", "reason", "flag", "key")


def write_extxyz(campaigns: Sequence[OpenCampaign], path: Path) -> int:
    """Write the geometries of some campaigns to one file, which appears whole; return how many frames.

    A point whose geometry no record tells, since its job left nothing, has no frame.

    Raises:
        OSError: the file cannot be written.
    """
    n = 0
    with replacing(path) as temporary, temporary.open("w", encoding="utf-8") as out:
        for campaign in campaigns:
            for name, scan in campaign.scans.items():
                for frame in frames(campaign.name, name, scan):
                    out.write(frame)
                    n += 1
    return n


def frames(campaign: str, name: str, scan: xr.Dataset) -> Iterator[str]:
    """Give one frame for each point and level of a scan."""
    if "positions" not in scan:
        return
    positions = scan["positions"].values * BOHR_IN_ANGSTROM
    symbols = [str(symbol) for symbol in scan["element"].values]
    bodies = [_body(symbols, geometry) for geometry in positions]
    columns = {word: scan[word].values.astype(str) for word in _WORDS}
    for row, level in enumerate(scan["level"].values):
        for column, number in enumerate(scan["point"].values):
            if np.isfinite(positions[column]).all():
                head = {"campaign": campaign, "scan": name, "level": str(level), "point": int(number)}
                head["coordinate_angstrom"] = float(scan["coordinate_angstrom"].values[column])
                head |= _energies(float(scan["energy"].values[row, column]))
                head |= {word: str(values[row, column]) for word, values in columns.items()}
                yield f"{len(symbols)}\n{_comment(head)}\n{bodies[column]}"


def _energies(energy: float) -> dict[str, float]:
    return {"energy": energy * HARTREE_IN_EV, "energy_hartree": energy} if np.isfinite(energy) else {}


def _body(symbols: Sequence[str], geometry: np.ndarray) -> str:
    rows = zip(symbols, geometry, strict=True)
    return "".join(f"{s:2s} {x:16.10f} {y:16.10f} {z:16.10f}\n" for s, (x, y, z) in rows)


def _comment(head: dict[str, Any]) -> str:
    words = ['Properties=species:S:1:pos:R:3 pbc="F F F"']
    words += [f"{name}={_quoted(value)}" for name, value in head.items() if value != ""]
    return " ".join(words)


def _quoted(value: object) -> str:
    if not isinstance(value, str):
        return repr(value)
    text = " ".join(value.split()).replace("\\", "\\\\").replace('"', '\\"')
    return f'"{text}"'
