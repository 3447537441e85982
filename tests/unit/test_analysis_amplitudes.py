"""Neighbouring coupled-cluster solutions are told apart by what their amplitudes excite into."""

from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from scission.analysis.amplitudes import amplitude_steps, density_overlap
from scission.records import Record, Store

RNG = np.random.default_rng(7)


def _point(number: int) -> SimpleNamespace:
    return SimpleNamespace(
        scan="s", level="cc", number=number, coordinate=(1.0 + number,), names=("r",), key=f"k{number:03d}"
    )


def _write(store: Store, number: int, shape: np.ndarray) -> None:
    record = Record(f"k{number:03d}", "point", "converged", scalars={"energy": -1.0 - 0.1 * number})
    record.inputs, record.arrays = {"correlation": "CCSD"}, {"amplitude_orbitals": shape}
    store.write(record)


def test_overlap_ignores_phases_and_order() -> None:
    """The overlap of a density with itself is one, whatever the signs and order of its orbitals."""
    a = RNG.normal(size=(3, 8))

    assert density_overlap(a, -a[::-1]) == pytest.approx(1.0)


def test_another_solution_is_reported_between_its_points(tmp_path: Path) -> None:
    """One row names the interval in which the amplitudes turn into something else, with the energy step."""
    store = Store(tmp_path)
    one, other = np.eye(8)[:2], np.eye(8)[4:6]
    for number, shape in ((1, one), (2, one), (3, other), (4, other)):
        _write(store, number, shape)

    (row,) = amplitude_steps([_point(n) for n in (1, 2, 3, 4)], store)["s", "cc"]

    assert (row["from_angstrom"], row["to_angstrom"]) == (3.0, 4.0)
    assert row["overlap"] == pytest.approx(0.0)
    assert row["energy_step_hartree"] == pytest.approx(-0.1)


def test_a_smooth_curve_reports_nothing(tmp_path: Path) -> None:
    """Amplitudes that stay alike give no row."""
    store = Store(tmp_path)
    for number in (1, 2, 3):
        _write(store, number, np.eye(8)[:2])

    assert amplitude_steps([_point(n) for n in (1, 2, 3)], store) == {}
