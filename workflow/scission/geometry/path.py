"""What every kind of coordinate gives back, and how it says what is wrong."""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray


@dataclass(frozen=True)
class ScanPath:
    """Geometries along a scan.

    names : names of the coordinates, such as ``"O1-H2 distance"``
    values : (n_points, n_coordinates), angstrom
    positions : (n_points, n_atoms, 3), bohr
    bonds : pairs of 0-based atoms whose bond is stretched
    fragments : 0-based atoms, those that stay (with any further molecule) and those that move
    """

    names: tuple[str, ...]
    values: NDArray[np.float64]
    positions: NDArray[np.float64]
    bonds: tuple[tuple[int, int], ...]
    fragments: tuple[tuple[int, ...], tuple[int, ...]]


@dataclass(frozen=True)
class Fault:
    """One fault of a scan's block: its place inside the block, the value there and the rule."""

    where: tuple[str | int, ...]
    value: object
    rule: str


class GeometryError(ValueError):
    """A scan whose geometries cannot be built; ``faults`` lists why."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = list(faults)
        super().__init__(
            "; ".join(f"{'.'.join(map(str, f.where))}: {f.value!r} {f.rule}" for f in self.faults)
        )
