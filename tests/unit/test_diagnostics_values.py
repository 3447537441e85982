"""Diagnostics against closed forms of two electrons in two orbitals, and against the engine's densities."""

from dataclasses import replace

import numpy as np
import pytest
from pyscf import fci
from scission.chemistry.ci_vectors import analyse_vector
from scission.diagnostics import DIAGNOSTICS, Absent
from scission.solution import Solution


def two_orbitals(weight, reference="CASSCF", electrons=(1, 1)):
    """c0 |gg> - c1 |uu>, c1^2 = ``weight``: the wavefunction of a stretched bond in its two orbitals."""
    vector = np.array([[np.sqrt(1.0 - weight), 0.0], [0.0, -np.sqrt(weight)]])
    facts = analyse_vector(vector, 2, electrons)
    empty = np.zeros((1, 2, 2))
    made = Solution(reference, "none", True, -1.0, electrons, 0.0, empty, np.zeros((1, 2)), np.eye(2))
    return replace(
        made,
        natural_occupations=facts.natural_occupations,
        spin_occupations=facts.spin_occupations,
        orbital_weights=facts.orbital_weights,
        leading_weight=facts.leading_weight,
    )


def value(name, solution):
    return DIAGNOSTICS[name].evaluate(solution)


@pytest.mark.parametrize(
    ("name", "broken"),
    [
        ("n_d", 2.0),
        ("n_u", 2.0),
        ("n_u_squared", 2.0),
        ("y", 1.0),
        ("i_nd", 0.5),
        ("i_d", 0.0),
        ("z_s1", 0.5),
        ("largest_s1", np.log(2.0)),
        ("m_diagnostic", 1.0),
        ("c0_squared", 0.5),
    ],
)
def test_a_broken_bond_in_two_orbitals(name, broken):
    """H2 infinitely stretched in a minimal basis, n = 1, 1.

    I_ND = 1/2: Ramos-Cordoba, Salvador and Matito, PCCP 18, 24015 (2016); Z_s(1) = 1/2: Stein and Reiher,
    Mol. Phys. 115, 2110 (2017) (both from memory); the others follow from their formulas.
    """
    assert value(name, two_orbitals(0.5)) == pytest.approx(broken, abs=1e-12)


@pytest.mark.parametrize("name", ["n_d", "n_u", "n_u_squared", "y", "i_nd", "i_d", "z_s1", "m_diagnostic"])
def test_one_determinant_has_nothing_unpaired(name):
    """n = 2, 0 gives zero, exactly as the formulas say."""
    assert value(name, two_orbitals(0.0)) == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("w", [0.02, 0.1, 0.3])
def test_formulas_in_terms_of_the_second_weight(w):
    """Occupations are 2(1-w) and 2w: N_D = 8w(1-w), N_U = 4w, M = 2w, and y with T = 1 - 2w."""
    solution, t = two_orbitals(w), 1.0 - 2.0 * w
    entropy = -w * np.log(w) - (1.0 - w) * np.log(1.0 - w)

    assert value("n_d", solution) == pytest.approx(8.0 * w * (1.0 - w))
    assert value("n_u", solution) == pytest.approx(4.0 * w)
    assert value("n_u_squared", solution) == pytest.approx(32.0 * (w * (1.0 - w)) ** 2)
    assert value("m_diagnostic", solution) == pytest.approx(2.0 * w)
    assert value("y", solution) == pytest.approx(1.0 - 2.0 * t / (1.0 + t * t))
    assert value("i_nd", solution) == pytest.approx(2.0 * w * (1.0 - w))
    assert value("i_d", solution) == pytest.approx(np.sqrt(w * (1.0 - w)) - 2.0 * w * (1.0 - w))
    assert value("z_s1", solution) == pytest.approx(entropy / np.log(4.0))


def test_orbital_weights_agree_with_the_two_particle_density():
    """Weights from squared coefficients equal those from the engine's spin-resolved densities."""
    rng = np.random.default_rng(7)
    vector = rng.normal(size=(10, 5))
    vector /= np.linalg.norm(vector)
    facts = analyse_vector(vector, 5, (3, 1))
    (alpha, beta), (_, pairs, _) = fci.direct_spin1.make_rdm12s(vector, 5, (3, 1))
    _, u = np.linalg.eigh(alpha + beta)
    u = u[:, ::-1]
    both = np.einsum("pqrs,pi,qi,ri,si->i", pairs, u, u, u, u)
    n_alpha = np.einsum("pq,pi,qi->i", alpha, u, u)

    assert facts.orbital_weights.sum(axis=1) == pytest.approx(np.ones(5))
    assert facts.orbital_weights[:, 3] == pytest.approx(both)
    assert facts.orbital_weights[:, 1] + facts.orbital_weights[:, 3] == pytest.approx(n_alpha)


@pytest.mark.parametrize(
    "name", ["i_nd", "z_s1", "m_diagnostic", "cc_luno", "n_fod", "b1", "mayer", "tae_share"]
)
def test_what_is_not_known_is_absent_and_not_zero(name):
    """A determinant without densities of its own gives reasons in words."""
    bare = replace(
        two_orbitals(0.0, reference="UHF"), spin_occupations=None, orbital_weights=None, dipole=None
    )
    result = value(name, bare)

    assert isinstance(result, Absent)
    assert len(result.reason) > 10


def test_fractional_occupations_count_both_sides():
    """N_FOD of one pair, f = 0.9 and 0.1 in each spin: 2 (0.1 + 0.1)."""
    solution = replace(two_orbitals(0.0), fractional_occupations=np.array([[0.9, 0.1]]))

    assert value("n_fod", solution) == pytest.approx(0.4)


def test_an_unphysical_coupled_cluster_density_is_refused():
    """Occupations above 2 come from an expansion that has failed."""
    solution = replace(two_orbitals(0.0), cc_occupations=np.array([2.4, -0.4]))

    assert "unphysical" in value("cc_luno", solution).reason
