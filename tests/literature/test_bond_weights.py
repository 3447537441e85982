"""Covalent weights of real bonds: numbers that an independent prototype of this analysis gave."""

import numpy as np
import pytest
from in_process import compute
from scission.chemistry.bond_picture import chirgwin_coulson
from scission.plan import make_plan

CAMPAIGN = """
campaign: weights
molecules:
  bond: {{charge: 0, multiplicity: 1, atoms: "{a} 0 0 0\\n{b} 0 0 {r}"}}
levels:
  cas: {{reference: CASSCF, active_space: {space}, basis: cc-pVDZ}}
scans:
  stretch: {{molecule: bond, levels: [cas], stretch: {{bond: [{a}1, {b}2], lengths: [{r}, {far}]}}}}
"""
PAIR = "{electrons: 2, orbitals: 2}"

# Weight of the covalent structure at R_e in CASSCF(2,2)/cc-pVDZ, orthogonal and non-orthogonal, as a separate
# prototype computed them (two digits).
KNOWN = [
    ("H", "H", 0.7414, 0.61, 0.77),
    ("H", "F", 0.9168, 0.54, 0.60),
    pytest.param("Li", "H", 1.5957, 0.64, 0.77, marks=pytest.mark.slow),
    pytest.param("F", "F", 1.4119, 0.75, 0.79, marks=pytest.mark.slow),
]


def numbers(folder, a, b, r, space=PAIR):
    """Scalars and transfer weights at ``r`` and at 4 r (angstrom)."""
    text = CAMPAIGN.format(a=a, b=b, r=r, far=4 * r, space=space)
    campaign, store = compute(text, folder)
    records = [store.read("reference", p.reference_key) for p in make_plan(campaign).points]
    return [(record.scalars, record.arrays["transfer_weights"]) for record in records]


@pytest.mark.parametrize(("a", "b", "r", "orthogonal", "own"), KNOWN)
def test_covalent_weights_at_the_minimum_and_far_out(tmp_path, a, b, r, orthogonal, own):
    """Two digits agree at R_e; four times as far the bond is covalent to one percent."""
    (near, _), (far, transfer) = numbers(tmp_path, a, b, r)

    assert near["bond_covalent"] == pytest.approx(orthogonal, abs=0.006)
    assert near["vb_covalent"] == pytest.approx(own, abs=0.006)
    assert near["vb_captured"] > 0.87
    assert far["bond_covalent"] == pytest.approx(1.0, abs=0.01)
    assert far["vb_covalent"] == pytest.approx(1.0, abs=0.01)
    assert np.sum(transfer) == pytest.approx(1.0, abs=1e-10)


@pytest.mark.slow
def test_a_triple_bond_breaks_into_three_electrons_each(tmp_path):
    """N2 in (6,6): symmetric transfer at R_e and a bond order below three; three and three far out."""
    (near, transfer), (far, apart) = numbers(tmp_path, "N", "N", 1.0977, "auto")

    assert transfer == pytest.approx(transfer[::-1], abs=1e-4)
    assert 2.7 < near["bond_order"] < 3.0
    assert apart[3] == pytest.approx(1.0, abs=1e-3)
    assert far["bond_order"] == pytest.approx(0.0, abs=0.02)


@pytest.mark.parametrize("overlap", [0.0, 0.3, 0.75])
def test_weights_of_the_doubly_occupied_bond_orbital(overlap):
    """Half covalent and a quarter ionic each way for any overlap: algebra of (a + b)(a + b)."""
    weights, _ = chirgwin_coulson(np.ones((2, 2)), overlap)

    assert weights == pytest.approx([0.5, 0.25, 0.25])


def test_weights_of_two_configurations_follow_from_their_coefficients(tmp_path):
    """Orthogonal covalent weight of c0 g^2 + c1 u^2 is (c0 - c1)^2 / 2: algebra of two localised orbitals."""
    (near, _), _ = numbers(tmp_path, "H", "H", 0.7414)
    order = near["bond_order"]  # c0^2 - c1^2 with c0^2 + c1^2 = 1
    c0, c1 = np.sqrt((1 + order) / 2), -np.sqrt((1 - order) / 2)

    assert near["bond_covalent"] == pytest.approx((c0 - c1) ** 2 / 2, abs=1e-6)
