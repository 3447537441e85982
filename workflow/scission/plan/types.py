"""The plan's data: points, nodes and chains of references, jobs."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from scission.campaign import Campaign


@dataclass(frozen=True)
class Point:
    """One geometry of one scan at one level.

    ``number`` counts from 1 along the scan; ``coordinate`` is in angstrom (first entry: the bond length),
    ``names`` names its entries.  Points that agree in everything that decides numbers share ``key``.
    ``extras`` are (calculation, key) of the records that hold costly diagnostics of the point.
    """

    scan: str
    level: str
    number: int
    coordinate: tuple[float, ...]
    names: tuple[str, ...]
    key: str
    reference_key: str
    extras: tuple[tuple[str, str], ...] = ()


@dataclass(frozen=True)
class Node:
    """One geometry at which a reference is established; ``auxiliary`` ones only bridge gaps of the grid."""

    key: str
    coordinate: float
    positions: NDArray[np.float64]
    auxiliary: bool


@dataclass(frozen=True)
class Chain:
    """References of one kind along one coordinate, in the order of the coordinate.

    ``start`` is the index of the node nearest to the expected equilibrium, ``stretched`` of the one where
    the bond counts as broken enough to show its orbitals (see :mod:`scission.plan.chains`).
    """

    name: str
    molecule: dict[str, Any]
    spec: dict[str, Any]
    bonds: tuple[tuple[int, int], ...]
    fragments: tuple[tuple[int, ...], ...]
    nodes: tuple[Node, ...]
    start: int
    stretched: int


@dataclass(frozen=True)
class Job:
    """One unit of work for the engine; ``payload`` is everything its worker has to know.

    ``stage`` is reference, correlate or fragments.
    """

    id: str
    stage: str
    needs: tuple[str, ...]
    n_points: int
    mem_mb: int
    runtime_min: int
    payload: dict[str, Any] = field(repr=False)


@dataclass(frozen=True)
class Plan:
    """All points and jobs of one campaign."""

    campaign: Campaign
    points: tuple[Point, ...]
    jobs: tuple[Job, ...]
    physics_version: int
    digest: str
