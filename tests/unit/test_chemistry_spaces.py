"""Fragments' densities, active spaces that are chosen, and the spin that is kept."""

import numpy as np
import pytest
from chemistry_support import Bench, angstrom, diatomic
from scission.chemistry.fragments import fragment_densities, promising_splits
from scission.chemistry.molecule import build_mole

SMALL = "6-31g"
ETHYLENE = (
    ["C", "C", "H", "H", "H", "H"],
    angstrom(
        (0.0, 0.0, 0.0), (0.0, 0.0, 2.66), (0.923, 0.0, -0.56), (-0.923, 0.0, -0.56),
        (0.923, 0.0, 3.22), (-0.923, 0.0, 3.22),
    ),
)  # fmt: skip
"""The double bond at twice its length, the halves rigid."""


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """One bench for all."""
    return Bench(tmp_path_factory.mktemp("spaces"))


def facts(symbols, charge=0, multiplicity=1):
    """What the chemistry is told of a molecule."""
    return {"symbols": symbols, "charge": charge, "multiplicity": multiplicity}


@pytest.mark.parametrize(
    ("symbols", "charge", "multiplicity", "spins"),
    [
        (["Li", "F"], 0, 1, (6.0, 6.0)),
        (["N", "N"], 0, 1, (7.0, 7.0)),
        (["O", "O"], 0, 3, (9.0, 7.0)),
        (["H", "He"], 1, 1, (1.0, 1.0)),
    ],
)
def test_densities_of_fragments_hold_the_electrons_of_each_spin(symbols, charge, multiplicity, spins):
    """Every start from fragments has the molecule's alpha and beta electrons."""
    positions = np.array(diatomic(*symbols, 8.0)[1])
    basis = dict.fromkeys(symbols, SMALL)
    overlap = build_mole(facts(symbols, charge, multiplicity), basis, positions).intor("int1e_ovlp")
    found = list(
        fragment_densities(
            facts(symbols, charge, multiplicity), basis, positions, [[0], [1]], positions[1] - positions[0]
        )
    )

    assert found
    for label, density in found:
        assert [np.trace(d @ overlap) for d in density] == pytest.approx(spins, abs=1e-6), label


def test_both_neutral_and_ionic_fragments_are_tried():
    """LiF far apart: neutral atoms come first, Li+ and F- are among the splits, and lie higher."""
    symbols, positions = diatomic("Li", "F", 20.0)
    splits = promising_splits(facts(symbols), dict.fromkeys(symbols, SMALL), np.array(positions), [[0], [1]])
    charges = [tuple(s.charge for s in split.states) for split in splits]

    assert charges[0] == (0, 0)
    assert (1, -1) in charges
    assert min(s.energy for s in splits) == splits[0].energy


@pytest.mark.parametrize(
    ("molecule", "multiplicity", "electrons", "orbitals"),
    [
        (diatomic("H", "H", 2.8), 1, 2, 2),
        (diatomic("N", "N", 4.15), 1, 6, 6),
        (diatomic("H", "F", 3.5), 1, 2, 2),
        (diatomic("O", "H", 3.7), 2, 3, 3),
        (ETHYLENE, 1, 4, 4),
    ],
    ids=["H2", "N2", "HF", "OH", "C2H4"],
)
def test_automatic_spaces_have_the_size_of_the_bond(bench, molecule, multiplicity, electrons, orbitals):
    """One bond two orbitals, a double bond four, a triple bond six; an unpaired electron one more.

    Bonding and antibonding orbital of each bond: the textbook's minimal space.
    """
    symbols, positions = molecule
    n = len(symbols)
    fragments = [[0], [1]] if n == 2 else [[0, 2, 3], [1, 4, 5]]
    record = bench.compute(
        symbols, positions, "CASSCF", basis=SMALL, multiplicity=multiplicity, fragments=fragments
    )
    spin = (multiplicity - 1) / 2.0

    assert record.status == "converged"
    assert list(record.arrays["active"][1:]) == [orbitals, electrons]
    assert record.diagnostics["s2"] == pytest.approx(spin * (spin + 1.0), abs=1e-6)
    assert len(record.notes["active_space"].split()) > 3


@pytest.mark.parametrize("multiplicity", [1, 3])
def test_an_active_space_keeps_the_spin_that_was_asked_for(bench, multiplicity):
    """Singlet and triplet H2 at 8 bohr are degenerate; each comes out pure, <S^2> 0 and 2."""
    record = bench.compute(
        *diatomic("H", "H", 8.0), "CASSCF", basis=SMALL, multiplicity=multiplicity,
        active_space={"electrons": 2, "orbitals": 2},
    )  # fmt: skip

    assert record.diagnostics["s2"] == pytest.approx({1: 0.0, 3: 2.0}[multiplicity], abs=1e-8)


def test_an_active_space_of_named_atomic_orbitals_holds_them(bench):
    """The six 2p orbitals of N2: 6 electrons in 6 orbitals, the 1s and 2s pairs inactive."""
    space = {"electrons": 6, "orbitals": 6, "atomic_orbitals": ["N 2p"]}
    record = bench.compute(*diatomic("N", "N", 4.15), "CASSCF", basis="sto-3g", active_space=space)

    assert list(record.arrays["active"]) == [4, 6, 6]
    assert record.arrays["natural_occupations"].sum() == pytest.approx(6.0, abs=1e-8)


def test_an_active_space_lies_below_the_determinant_within_it(bench):
    """E(CASSCF) < E(RHF): the determinant is one vector of the space."""
    hf = diatomic("H", "F", 3.5)

    assert bench.energy(*hf, "CASSCF", basis=SMALL) < bench.energy(*hf, "RHF", basis=SMALL)


def test_averaged_states_come_in_order(bench):
    """Two states of LiF: energies ascend, and the average of the two is above the single state's minimum."""
    lif = diatomic("Li", "F", 12.0)
    two = bench.compute(*lif, "CASSCF", basis=SMALL, states=2)
    states = two.arrays["state_energies"]

    assert states[0] < states[1]
    assert two.scalars["energy"] == states[0]
