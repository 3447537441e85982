"""Bases, core potentials, frozen cores and the identities between levels."""

import numpy as np
import pytest
from chemistry_support import Bench, diatomic, task
from pyscf import cc, gto, mp, scf
from scission.chemistry import amplitudes

ORIGIN = [[0.0, 0.0, 0.0]]


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """One bench for all."""
    return Bench(tmp_path_factory.mktemp("levels"))


def engine(symbols, positions, basis, **more):
    """The engine's molecule by its own front door."""
    return gto.M(atom=list(zip(symbols, positions, strict=True)), unit="Bohr", basis=basis, verbose=0, **more)


def test_a_basis_per_element_is_used_per_element(bench):
    """HF with another basis on each atom is what the engine gives for it."""
    hf, basis = diatomic("H", "F", 1.75), {"H": "sto-3g", "F": "6-31g"}
    record = bench.compute(*hf, "RHF", basis=basis)

    assert record.scalars["n_basis"] == 1 + 9
    assert record.scalars["energy"] == pytest.approx(scf.RHF(engine(*hf, basis)).kernel(), abs=1e-8)


def test_core_potentials_come_with_their_basis(bench):
    """HI in def2-SVP: 28 electrons of iodine are in the potential, and the energy is the engine's own."""
    hi = diatomic("H", "I", 3.04)
    record = bench.compute(*hi, "RHF", basis="def2-svp", starts=[{"engine": "minao"}])
    own = scf.RHF(engine(*hi, "def2-svp", ecp="def2-svp")).run(conv_tol=1e-10)

    assert own.mol.nelectron == 54 - 28
    assert record.scalars["energy"] == pytest.approx(own.e_tot, abs=1e-7)


@pytest.mark.parametrize(
    ("symbols", "r", "frozen", "correlated"),
    [
        (["N", "N"], 2.1, True, 10),
        (["N", "N"], 2.1, False, 14),
        (["Li", "H"], 3.0, True, 4),
        (["Al", "H"], 3.1, True, 4),
        (["H", "Cl"], 2.4, True, 8),
    ],
)
def test_frozen_cores_are_the_usual_ones(bench, symbols, r, frozen, correlated):
    """Boron to neon 1s, aluminium to argon neon's shells (textbook convention); lithium correlates its 1s."""
    record = bench.compute(
        *diatomic(*symbols, r), "RHF", "MP2", frozen_core=frozen, basis="sto-3g", starts=[{"engine": "minao"}]
    )

    assert record.scalars["n_correlated"] == correlated


def test_electrons_of_a_core_potential_are_not_frozen_twice(bench):
    """HI in def2-SVP: of iodine's 25 electrons outside it 4s 4p are core, 4d 5s 5p are correlated."""
    record = bench.compute(
        *diatomic("H", "I", 3.04),
        "RHF",
        "MP2",
        frozen_core=True,
        basis="def2-svp",
        starts=[{"engine": "minao"}],
    )

    assert record.scalars["n_correlated"] == 18


@pytest.mark.parametrize(("reference", "multiplicity", "symbols", "r"), [
    ("RHF", 1, ["H", "F"], 1.75), ("UHF", 2, ["O", "H"], 1.85)
])  # fmt: skip
def test_correlation_is_what_the_engine_gives(bench, reference, multiplicity, symbols, r):
    """MP2 and CCSD(T), frozen core, against the engine called directly (1e-7 hartree)."""
    molecule = diatomic(*symbols, r)
    field = getattr(scf, reference)(engine(*molecule, "6-31g", spin=multiplicity - 1)).run(conv_tol=1e-11)
    coupled = cc.CCSD(field, frozen=1).run(conv_tol=1e-10)
    own = {"MP2": mp.MP2(field, frozen=1).run().e_tot, "CCSD(T)": coupled.e_tot + coupled.ccsd_t()}

    for method, energy in own.items():
        mine = bench.energy(
            *molecule, reference, method, frozen_core=True, basis="6-31g", multiplicity=multiplicity
        )
        assert mine == pytest.approx(energy, abs=1e-7), method


def test_coupled_cluster_does_not_depend_on_how_a_closed_shell_is_written(bench):
    """RHF, UHF and ROHF give one CCSD(T) energy for N2 at its equilibrium."""
    n2 = diatomic("N", "N", 2.07)
    found = [
        bench.energy(*n2, kind, "CCSD(T)", frozen_core=True, basis="sto-3g", starts=[{"engine": "minao"}])
        for kind in ("RHF", "UHF", "ROHF")
    ]

    assert found == pytest.approx([found[0]] * 3, abs=1e-7)


def test_full_ci_does_not_depend_on_its_orbitals(bench):
    """From restricted and from broken orbitals full CI of stretched H2 is the same, and a singlet."""
    h2 = diatomic("H", "H", 4.0)
    records = [bench.compute(*h2, kind, "FCI", basis="6-31g") for kind in ("RHF", "UHF")]

    assert records[0].scalars["energy"] == pytest.approx(records[1].scalars["energy"], abs=1e-9)
    assert [r.diagnostics["s2"] for r in records] == pytest.approx([0.0, 0.0], abs=1e-8)


@pytest.mark.parametrize(("symbol", "multiplicity"), [("H", 2), ("He", 1)])
@pytest.mark.parametrize("reference", ["UHF", "ROHF"])
def test_atoms_without_an_empty_orbital_are_no_fault(bench, reference, symbol, multiplicity):
    """Hydrogen and helium in a minimal basis have nothing to be unstable towards."""
    record = bench.compute([symbol], ORIGIN, reference, basis="sto-3g", multiplicity=multiplicity)

    assert record.status == "converged"


def test_triplet_stability_is_the_closed_form_of_the_minimal_basis(bench):
    """Two orbitals: the eigenvalue is that of e_u - e_g - (gg|uu) - (gu|gu), up to the engine's factor.

    Szabo and Ostlund, Modern Quantum Chemistry, section 3.8.7; zero and sign do not depend on the factor,
    so the ratio to the closed form is the same at every length.
    """
    ratios = []
    for r in (1.4, 2.0, 3.0):
        h2 = diatomic("H", "H", r)
        field = scf.RHF(engine(*h2, "sto-3g")).run(conv_tol=1e-12)
        g, u = field.mo_coeff.T
        eri = field.mol.intor("int2e")
        coulomb = np.einsum("p,q,r,s,pqrs", g, g, u, u, eri)
        exchange = np.einsum("p,q,r,s,pqrs", g, u, g, u, eri)
        closed_form = field.mo_energy[1] - field.mo_energy[0] - coulomb - exchange
        record = bench.compute(*h2, "RHF", basis="sto-3g", starts=[{"engine": "minao"}])
        ratios.append(record.diagnostics["triplet_stability"] / closed_form)

    assert ratios == pytest.approx([ratios[0]] * 3, rel=1e-6)
    assert ratios[0] > 0.0


def test_levels_of_a_geometry_share_their_amplitudes(bench, monkeypatch):
    """CCSD(T) after CCSD starts from its amplitudes: few iterations, and the energy it has by itself."""
    f2 = task("r0001", *diatomic("F", "F", 2.7), basis="6-31g")
    bench.run(f2)
    cycles = []
    update = cc.ccsd.CCSD.update_amps
    monkeypatch.setattr(cc.ccsd.CCSD, "update_amps", lambda self, *a: cycles.append(1) or update(self, *a))
    amplitudes._memory.clear()
    alone = bench.correlate(f2, "CCSD(T)", frozen_core=True)
    by_itself = len(cycles)
    amplitudes._memory.clear()
    bench.correlate(f2, "CCSD", frozen_core=True)
    cycles.clear()
    after = bench.correlate(f2, "CCSD(T)", frozen_core=True)

    assert 0 < len(cycles) < by_itself / 2
    assert after.scalars["energy"] == pytest.approx(alone.scalars["energy"], abs=1e-8)
