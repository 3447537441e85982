"""Orbitals that are carried between geometries and compared there."""

import numpy as np
import pytest
from chemistry_support import Bench, diatomic, task
from hypothesis import given
from hypothesis import strategies as st
from scission.chemistry.compare import likeness, overlap_and_swap
from scission.chemistry.molecule import build_mole, root_overlap
from scission.chemistry.orbitals import (
    Orbitals,
    natural_occupations,
    not_orthonormal,
    state_overlap,
    state_overlap_any_spin,
    subspace_overlap,
)
from scission.chemistry.starts import carried

SMALL = "6-31g"


def molecule(symbols, positions, basis=SMALL):
    """The engine's molecule."""
    facts = {"symbols": symbols, "charge": 0, "multiplicity": 1}
    return build_mole(facts, dict.fromkeys(symbols, basis), np.array(positions))


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """One bench for all."""
    return Bench(tmp_path_factory.mktemp("orbitals"))


@pytest.fixture(scope="module")
def hydrogen_fluoride(bench):
    """The restricted reference of HF near its equilibrium."""
    return bench.compute(*diatomic("H", "F", 1.75), "RHF", basis=SMALL)


@pytest.mark.parametrize("r", [1.0, 1.75, 3.0, 19.0])
def test_carried_orbitals_are_orthonormal_where_they_arrive(hydrogen_fluoride, r):
    """Whatever the step, C^T S C is the unit matrix at the new geometry."""
    mole = molecule(*diatomic("H", "F", r))
    coeff = carried(hydrogen_fluoride, mole).coeff[0]
    overlap = mole.intor("int1e_ovlp")

    assert np.abs(coeff.T @ overlap @ coeff - np.eye(len(coeff))).max() < 1e-12


def test_orbitals_carried_nowhere_stay_what_they_are(hydrogen_fluoride):
    """At the same geometry carrying changes nothing: the density holds all electrons, orbital by orbital."""
    mole = molecule(*diatomic("H", "F", 1.75))
    here = carried(hydrogen_fluoride, mole)
    root, _ = root_overlap(mole)

    assert np.trace(here.density() @ root @ root) == pytest.approx(10.0, abs=1e-10)
    assert here.transformed(root).coeff == pytest.approx(hydrogen_fluoride.arrays["mo_lowdin"], abs=1e-10)


@pytest.mark.parametrize("reference", ["RHF", "UHF", "CASSCF"])
def test_a_state_overlaps_fully_with_itself(bench, reference):
    """The overlap of a record with itself is 1."""
    record = bench.compute(*diatomic("H", "F", 3.4), reference, basis=SMALL)

    assert likeness(record, record) == pytest.approx(1.0, abs=1e-10)


def test_neighbours_are_more_alike_than_strangers(bench, hydrogen_fluoride):
    """Overlaps fall with the distance of the geometries and stay between 0 and 1."""
    others = [bench.compute(*diatomic("H", "F", r), "RHF", basis=SMALL) for r in (1.8, 2.6, 6.0)]
    overlaps = [likeness(hydrogen_fluoride, other) for other in others]

    assert 1.0 > overlaps[0] > overlaps[1] > overlaps[2] > 0.0
    assert overlaps[0] > 0.99


def test_exchanged_spins_are_recognised_and_exchanged_back(bench):
    """A broken-symmetry state with alpha and beta exchanged is the same; the task ``swap`` turns it back."""
    h2 = diatomic("H", "H", 5.0)
    what = task("broken", *h2, "UHF", basis=SMALL)
    first = bench.run(what)
    second = bench.run({**what, "kind": "swap"})
    third = bench.run({**what, "kind": "swap"})

    assert overlap_and_swap(first, second) == (pytest.approx(1.0, abs=1e-10), True)
    assert overlap_and_swap(first, third) == (pytest.approx(1.0, abs=1e-10), False)
    assert third.scalars["energy"] == first.scalars["energy"]


def rotation(n, seed):
    """A random orthogonal matrix."""
    return np.linalg.qr(np.random.default_rng(seed).normal(size=(n, n)))[0]


@given(st.integers(2, 7), st.integers(0, 2**31))
def test_the_overlap_of_spaces_does_not_depend_on_their_bases(n, seed):
    """Any rotation within a space leaves its overlap with another as it was; with itself it is 1."""
    full = rotation(n + 2, seed)
    a, b = full[:, :n], rotation(n + 2, seed + 1)[:, :n]
    turned = a @ rotation(n, seed + 2)

    assert subspace_overlap(a, turned) == pytest.approx(1.0, abs=1e-12)
    assert subspace_overlap(turned, b) == pytest.approx(subspace_overlap(a, b), abs=1e-12)
    assert not_orthonormal(turned) < 1e-12


def test_a_space_that_lost_a_direction_has_no_overlap():
    """One occupied orbital exchanged for an empty one: overlap 0, also for spaces of different size."""
    unit = np.eye(4)

    assert subspace_overlap(unit[:, :2], unit[:, [0, 3]]) == 0.0
    assert subspace_overlap(unit[:, :2], unit[:, :3]) == 0.0
    assert subspace_overlap(unit[:, :0], unit[:, :0]) == 1.0


def test_the_worse_spin_decides():
    """Alpha orbitals that agree do not hide beta orbitals that do not."""
    unit = np.eye(3)
    occ = np.array([[1.0, 0.0, 0.0], [1.0, 0.0, 0.0]])
    one = Orbitals(np.array([unit, unit]), occ)
    other = Orbitals(np.array([unit, unit[:, [1, 0, 2]]]), occ)

    assert state_overlap(one, other) == 0.0
    assert state_overlap_any_spin(one, other)[0] == 0.0


def test_singly_occupied_orbitals_belong_to_alpha():
    """A restricted open shell splits into spins by its occupations 2, 1 and 0."""
    orbitals = Orbitals(np.eye(3)[None], np.array([[2.0, 1.0, 0.0]]))
    alpha, beta = orbitals.density()

    assert (np.trace(alpha), np.trace(beta)) == (2.0, 1.0)
    assert [x.shape[1] for x in orbitals.occupied()] == [2, 1]


def test_natural_occupations_count_the_electrons(bench):
    """They decrease, lie between 0 and 2 and add up to the electrons."""
    record = bench.compute(*diatomic("H", "F", 3.4), "UHF", basis=SMALL)
    found = record.arrays["natural_occupations"]

    assert np.all(np.diff(found) <= 1e-12)
    assert found.sum() == pytest.approx(10.0, abs=1e-9)
    assert -1e-9 < found[-1] < found[0] < 2.0 + 1e-9


def test_natural_occupations_of_a_closed_shell_are_two_and_zero():
    """The density of doubly occupied orbitals has no other eigenvalues."""
    orbitals = rotation(5, 3)
    values, _ = natural_occupations(2.0 * orbitals[:, :2] @ orbitals[:, :2].T, np.eye(5))

    assert values == pytest.approx([2.0, 2.0, 0.0, 0.0, 0.0], abs=1e-12)
