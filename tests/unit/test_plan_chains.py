"""Chains of references: where they start, and how gaps of the grid are bridged."""

from dataclasses import replace
from itertools import pairwise

import pytest
from campaigns import changed, load
from hypothesis import given
from hypothesis import strategies as st
from scission.geometry import build_path
from scission.plan import make_plan
from scission.plan.chains import auxiliary_lengths, build_chain, merge_chains

EQUILIBRIUM = 0.74


def widest(lengths):
    """The largest ratio of neighbours, below three equilibrium lengths and beyond."""
    ratios = [(a, b / a) for a, b in pairwise(lengths)]
    near = max((r for a, r in ratios if a < 3 * EQUILIBRIUM), default=1.0)
    return near, max((r for a, r in ratios if a >= 3 * EQUILIBRIUM), default=1.0)


@given(st.lists(st.floats(0.4, 12.0), min_size=1, max_size=9, unique=True), st.booleans())
def test_auxiliary_lengths_bridge_any_grid(grid, need_stretched):
    """No step is wider than a state can be carried, and the chain reaches the equilibrium."""
    grid = sorted({round(x, 3) for x in grid})
    added = auxiliary_lengths(grid, EQUILIBRIUM, need_stretched)
    lengths = sorted([*grid, *added])
    near, far = widest(lengths)

    assert near < 1.36
    assert far < 2.01
    assert any(0.84 * EQUILIBRIUM < x < 1.21 * EQUILIBRIUM for x in lengths)
    if need_stretched:
        assert any(0.89 * 2 * EQUILIBRIUM < x < 1.26 * 2 * EQUILIBRIUM for x in lengths)


def test_a_dense_grid_needs_no_bridge():
    """Lengths that lie close together, from the equilibrium to the broken bond, are left alone."""
    grid = [0.74 * 1.1**k for k in range(12)]

    assert auxiliary_lengths(grid, EQUILIBRIUM, need_stretched=True) == []


def chain(folder, lengths, spec=None):
    """The chain of H2's scan with these lengths."""
    campaign = load(changed(("scans/hh/stretch/lengths", lengths)), folder)
    scan = campaign.scans["hh"]
    molecule = campaign.molecules[scan.molecule]
    spec = spec or {"reference": "RHF", "functional": None, "basis": {"H": "cc-pvdz"}, "follow": "anchor"}
    return build_chain("hh", molecule, scan, build_path(molecule, scan), spec)


def test_a_far_grid_is_reached_from_the_equilibrium(tmp_path):
    """Points at 8 and 10 angstrom only: the chain starts near the equilibrium, on auxiliary nodes."""
    made = chain(tmp_path, [8.0, 10.0])

    assert made.nodes[made.start].auxiliary
    assert made.nodes[made.start].coordinate == pytest.approx(EQUILIBRIUM, rel=0.2)
    assert [n.coordinate for n in made.nodes if not n.auxiliary] == [8.0, 10.0]
    assert [n.coordinate for n in made.nodes] == sorted(n.coordinate for n in made.nodes)


def test_an_active_space_is_chosen_where_the_bond_is_stretched(tmp_path):
    """The chain's stretched node lies near twice the equilibrium length, added where the grid has none."""
    spec = {"reference": "CASSCF", "functional": None, "basis": {"H": "cc-pvdz"}, "follow": "anchor"}
    made = chain(tmp_path, [0.7, 0.8], spec | {"active_space": "auto", "states": 1})

    assert made.nodes[made.stretched].coordinate == pytest.approx(2 * EQUILIBRIUM, rel=0.25)
    assert made.nodes[made.stretched].auxiliary


def test_scans_that_differ_in_their_grids_share_a_chain(tmp_path):
    """Their nodes are merged, each geometry once, and a grid point takes the place of an auxiliary node."""
    coarse = chain(tmp_path, [0.7, 2.0])
    between = next(n.coordinate for n in coarse.nodes if n.auxiliary)
    fine = replace(chain(tmp_path, [0.7, between]), name="fine")
    (together,) = merge_chains([coarse, fine])

    assert len({n.key for n in together.nodes}) == len(together.nodes)
    assert [n.auxiliary for n in together.nodes if n.coordinate == between] == [False]


def test_other_references_have_chains_of_their_own(tmp_path):
    """Chains of different bases are not merged."""
    one = chain(tmp_path, [0.7, 2.0])
    other = replace(one, spec={**one.spec, "basis": {"H": "sto-3g"}})

    assert len(merge_chains([one, other])) == 2


def test_levels_on_the_same_references_share_their_blocks(tmp_path):
    """CCSD and CCSD(T) on one reference are computed geometry by geometry in the same jobs; others are not."""
    levels = {
        "cc": {"reference": "RHF", "correlation": "CCSD(T)", "basis": "cc-pVDZ"},
        "cs": {"reference": "RHF", "correlation": "CCSD", "basis": "cc-pVDZ"},
        "uc": {"reference": "UHF", "correlation": "CCSD", "basis": "cc-pVDZ"},
    }
    stretch = {"bond": ["H1", "H2"], "lengths": [0.6, 0.8, 1.0]}
    scan = {"molecule": "hydrogen", "levels": list(levels), "stretch": stretch}
    campaign = load(changed(("levels", levels), ("scans", {"hh": scan})), tmp_path)
    blocks = [j.payload["points"] for j in make_plan(campaign).jobs if j.stage == "correlate"]
    together = [[(item["number"], item["level"]) for item in block] for block in blocks]

    assert [(1, "cc"), (1, "cs"), (2, "cc"), (2, "cs"), (3, "cc"), (3, "cs")] in together
    assert [(1, "uc"), (2, "uc"), (3, "uc")] in together
