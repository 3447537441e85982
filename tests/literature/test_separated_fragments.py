"""Ten angstrom apart the energy is the sum of the fragments', for the levels that are size-consistent.

That ten angstrom count as infinitely far for neutral fragments is common practice, no source.
"""

import numpy as np
import pytest
from chemistry_support import CLOSED, Bench, diatomic
from scission.units import ANGSTROM_IN_BOHR

FAR = 10.0 * ANGSTROM_IN_BOHR
ORIGIN = [[0.0, 0.0, 0.0]]
UNPAIRED = {"H": 1, "Li": 1, "F": 1, "N": 3}
SMALL = "6-31g"
DETERMINANT = 1e-6
"""What is left without dispersion: quadrupoles interact with R^-5, 4e-7 hartree for unit moments."""

CORRELATED = 2e-6
"""Correlated atoms attract each other by dispersion, C6/R^6: 1.1e-6 hartree for C6 = 50 a.u., more than
lithium and fluorine have (40); the point is that other levels miss by 1e-2 and more."""


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """One bench for all."""
    return Bench(tmp_path_factory.mktemp("far"))


def atoms(bench, symbols, reference, correlation="none", **more):
    """The sum of the atoms' energies, each in its ground state; one electron has nothing to correlate."""
    methods = [correlation if s != "H" else "none" for s in symbols]
    more |= {"basis": SMALL, "starts": CLOSED}
    return sum(
        bench.energy([s], ORIGIN, reference, method, multiplicity=UNPAIRED[s] + 1, **more)
        for s, method in zip(symbols, methods, strict=True)
    )


PAIRS = [("H", "H"), ("H", "F"), ("N", "N"), ("Li", "F")]


@pytest.mark.parametrize("pair", PAIRS)
def test_unrestricted_determinant_falls_apart_into_atoms(bench, pair):
    """UHF at 10 angstrom is the sum of UHF atoms, also for LiF, whose neutral atoms no start of the whole
    molecule need find."""
    energy = bench.energy(*diatomic(*pair, FAR), "UHF", basis=SMALL)

    assert energy == pytest.approx(atoms(bench, pair, "UHF"), abs=DETERMINANT)


@pytest.mark.parametrize("r_angstrom", [8.0, 9.0])
def test_lithium_fluoride_is_neutral_beyond_its_crossing(bench, r_angstrom):
    """Neutral atoms with an unpaired electron each, although the ionic bond holds up to 7 angstrom.

    Below the atoms by what remains of charge transfer: it falls by a factor of twenty an angstrom and is
    1.2e-6 hartree at 8 (own measurement; no superposition error, a ghost fluorine gives lithium 7e-9).
    """
    record = bench.compute(*diatomic("Li", "F", r_angstrom * ANGSTROM_IN_BOHR), "UHF", basis=SMALL)
    binding = atoms(bench, ("Li", "F"), "UHF") - record.scalars["energy"]

    assert -1e-8 < binding < {8.0: 1e-5, 9.0: DETERMINANT}[r_angstrom]
    assert record.diagnostics["s2"] == pytest.approx(1.0, abs=0.01)
    assert np.linalg.norm(record.arrays["dipole"]) < 0.1


@pytest.mark.parametrize("pair", [("H", "F"), pytest.param(("N", "N"), marks=pytest.mark.slow), ("Li", "F")])
def test_unrestricted_coupled_cluster_falls_apart_into_atoms(bench, pair):
    """UCCSD(T) on UHF is size-consistent when its reference is."""
    energy = bench.energy(*diatomic(*pair, FAR), "UHF", "CCSD(T)", frozen_core=True, basis=SMALL)

    assert energy == pytest.approx(atoms(bench, pair, "UHF", "CCSD(T)", frozen_core=True), abs=CORRELATED)


@pytest.mark.parametrize("pair", PAIRS)
def test_chosen_active_space_falls_apart_into_atoms(bench, pair):
    """CASSCF in the space that is chosen by itself is the sum of ROHF atoms: one open shell on each."""
    energy = bench.energy(*diatomic(*pair, FAR), "CASSCF", basis=SMALL)

    assert energy == pytest.approx(atoms(bench, pair, "ROHF"), abs=DETERMINANT)


def test_full_ci_of_hydrogen_falls_apart_into_atoms(bench):
    """Full CI of H2 is two hydrogen atoms."""
    energy = bench.energy(*diatomic("H", "H", FAR), "RHF", "FCI", basis=SMALL)

    assert energy == pytest.approx(atoms(bench, ("H", "H"), "ROHF"), abs=CORRELATED)


@pytest.mark.parametrize("pair", [("H", "H"), ("H", "F"), ("N", "N")])
def test_restricted_determinant_does_not(bench, pair):
    """RHF keeps ionic terms: more than 0.1 hartree above the atoms."""
    energy = bench.energy(*diatomic(*pair, FAR), "RHF", basis=SMALL)

    assert energy > atoms(bench, pair, "ROHF") + 0.1


def test_restricted_coupled_cluster_does_not(bench):
    """CCSD(T) on RHF does not repair HF at 10 angstrom: it ends more than 10 mEh below the atoms."""
    energy = bench.energy(*diatomic("H", "F", FAR), "RHF", "CCSD(T)", frozen_core=True, basis=SMALL)
    separate = atoms(bench, ("H", "F"), "UHF", "CCSD(T)", frozen_core=True)

    assert energy < separate - 1e-2
