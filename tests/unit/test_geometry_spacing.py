"""Graded grids: exact ends, dense where the well is, smooth steps."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scission.campaign import Molecule, Scan
from scission.geometry import build_path
from scission.geometry.spacing import even, graded

# Equilibrium lengths in angstrom: Huber and Herzberg, Constants of Diatomic Molecules (1979), from memory.
BONDS = [
    ("H", "H", 0.741),
    ("N", "N", 1.098),
    ("H", "F", 0.917),
    ("F", "F", 1.412),
    ("Li", "H", 1.596),
    ("C", "O", 1.128),
]


def _lengths(first: str, second: str, given_length: float, points: int) -> np.ndarray:
    molecule = Molecule(charge=0, multiplicity=1, atoms=f"{first} 0 0 0\n{second} 0 0 {given_length}")
    lengths = {"from": 0.7, "to": 10.0, "points": points, "spacing": "graded"}
    stretch = {"bond": [f"{first}1", f"{second}2"], "lengths": lengths}
    scan = Scan.model_validate({"molecule": "m", "levels": ["l"], "stretch": stretch})
    return build_path(molecule, scan).values[:, 0]


@pytest.mark.parametrize(("first", "second", "minimum"), BONDS)
def test_the_well_is_resolved(first: str, second: str, minimum: float) -> None:
    """Of 40 points to 10 angstrom the step at the minimum is below 0.05 angstrom."""
    lengths = _lengths(first, second, minimum, 40)
    place = int(np.searchsorted(lengths, minimum))

    assert lengths[place] - lengths[place - 1] < 0.05


@pytest.mark.parametrize(("first", "second", "minimum"), BONDS[1:])
def test_about_half_of_the_points_are_near_the_minimum(first: str, second: str, minimum: float) -> None:
    """Between 40 and 60 % of the points lie within 30 % of the minimum."""
    lengths = _lengths(first, second, minimum, 40)
    share = np.mean(np.abs(lengths - minimum) <= 0.3 * minimum)

    assert 0.4 <= share <= 0.6


@pytest.mark.parametrize("points", [25, 40])
def test_a_stretched_geometry_does_not_move_the_well(points: int) -> None:
    """Given far out, the minimum is expected at the sum of the covalent radii."""
    lengths = _lengths("H", "F", 6.0, points)

    assert np.mean(np.abs(lengths - 0.88) <= 0.3 * 0.88) >= 0.4


@given(st.floats(0.1, 5.0), st.floats(0.1, 50.0), st.integers(2, 200), st.floats(0.3, 5.0))
def test_graded_lengths_increase_between_exact_ends(
    first: float, width: float, points: int, centre: float
) -> None:
    """For any range the lengths increase, and the ends are the numbers given."""
    lengths = graded(first, first + width, points, centre)

    assert (lengths[0], lengths[-1], len(lengths)) == (first, first + width, points)
    assert np.all(np.diff(lengths) > 0)


@pytest.mark.parametrize("points", [25, 40, 100])
def test_steps_change_smoothly(points: int) -> None:
    """No step is more than 1.35 times its neighbour, and steps shrink to the minimum and grow beyond it."""
    steps = np.diff(graded(0.7, 10.0, points, 0.97))
    smallest = int(np.argmin(steps))

    assert np.all(np.abs(np.diff(np.log(steps))) < np.log(1.35))
    assert np.all(np.diff(steps[: smallest + 1]) < 0)
    assert np.all(np.diff(steps[smallest:]) > 0)


def test_a_grid_is_the_same_every_time() -> None:
    """Twice the same grid is the same bits: points are found again by their geometry."""
    assert np.array_equal(graded(0.7, 10.0, 40, 0.97), graded(0.7, 10.0, 40, 0.97))


def test_even_lengths() -> None:
    """Even spacing has equal steps and both ends."""
    assert even(1.0, 2.0, 5).tolist() == [1.0, 1.25, 1.5, 1.75, 2.0]
