"""What every diagnostic of the registry promises, and a few of them against the engine's own functions."""

from dataclasses import replace

import numpy as np
import pytest
from chemistry_support import Bench, angstrom, diatomic
from pyscf import cc, gto, scf
from scission.diagnostics import DIAGNOSTICS, Absent, evaluate_all
from scission.thresholds import THRESHOLDS

WATER = (["O", "H", "H"], angstrom((0.0, 0.0, 0.1173), (0.0, 0.7572, -0.4692), (0.0, -0.7572, -0.4692)))
SMALL = "6-31g"

CASES = {
    "closed shell": (WATER, "RHF", "none", {}),
    "closed shell, Kohn-Sham": (WATER, "RKS", "none", {"functional": "pbe"}),
    "closed shell, CCSD(T)": (WATER, "RHF", "CCSD(T)", {"frozen_core": True}),
    "closed shell, MP2": (WATER, "RHF", "MP2", {}),
    "no empty orbital": ((["He"], [[0.0, 0.0, 0.0]]), "RHF", "none", {"basis": "sto-3g"}),
    "open shell": (diatomic("O", "H", 1.85), "ROHF", "none", {"multiplicity": 2}),
    "open shell, CCSD(T)": (diatomic("O", "H", 1.85), "ROHF", "CCSD(T)", {"multiplicity": 2}),
    "broken symmetry": (diatomic("H", "H", 4.0), "UHF", "none", {}),
    "broken symmetry, CCSD": (diatomic("H", "H", 4.0), "UHF", "CCSD", {}),
    "active space": (diatomic("H", "F", 3.4), "CASSCF", "none", {}),
    "active space, NEVPT2": (diatomic("H", "H", 3.4), "CASSCF", "NEVPT2", {}),
    "active space, open shell": (diatomic("H", "H", 3.4), "CASSCF", "none", {"multiplicity": 3}),
    "full CI": (diatomic("H", "H", 2.0), "RHF", "FCI", {}),
    "one electron": (diatomic("H", "H", 2.0), "UHF", "none", {"charge": 1, "multiplicity": 2}),
    "one electron, one atom": ((["H"], [[0.0, 0.0, 0.0]]), "ROHF", "none", {"multiplicity": 2}),
}


@pytest.fixture(scope="module")
def solutions(tmp_path_factory):
    """Solutions of every kind that diagnostics meet, by name."""
    bench = Bench(tmp_path_factory.mktemp("solutions"))
    made = {
        name: bench.solution(*molecule, reference, correlation, **{"basis": SMALL, **more})
        for name, (molecule, reference, correlation, more) in CASES.items()
    }
    good = made["closed shell, CCSD(T)"]
    made["unconverged amplitudes"] = replace(good, converged=False)
    made["diverged"] = replace(good, converged=False, energy=float("nan"), t1=None, t2=None, energies={})
    return made


@pytest.mark.parametrize("name", DIAGNOSTICS)
def test_a_diagnostic_describes_itself(name):
    """Name, symbol, unit, meaning, source and docstring are there."""
    member = DIAGNOSTICS[name]

    assert member.name == name
    assert all(text.strip() for text in (member.symbol, member.unit, member.meaning, member.source))
    assert (member.evaluate.__doc__ or "").strip()


@pytest.mark.parametrize("name", DIAGNOSTICS)
def test_a_diagnostic_is_finite_or_says_why_not(name, solutions):
    """The value is a finite number, or absent with the reason in words."""
    for case, solution in solutions.items():
        value = DIAGNOSTICS[name].evaluate(solution)

        if isinstance(value, Absent):
            assert len(value.reason.split()) >= 3, case
        else:
            assert np.isfinite(value), case


@pytest.mark.parametrize("name", [n for n, d in DIAGNOSTICS.items() if not d.calculation])
def test_the_solutions_here_exercise_a_diagnostic(name, solutions):
    """The claims of this file say something of every diagnostic that comes with a level."""
    values = [DIAGNOSTICS[name].evaluate(s) for s in solutions.values()]

    assert any(not isinstance(v, Absent) for v in values)


def turned(solution, generator):
    """The same solution with other phases, and another order, of occupied and of empty orbitals."""
    coeff, occ = solution.mo_coeff.copy(), solution.mo_occ.copy()
    energy = None if solution.mo_energy is None else solution.mo_energy.copy()
    for s in range(len(coeff)):
        full = occ[s] > 0.5
        order = np.concatenate([generator.permutation(np.flatnonzero(part)) for part in (full, ~full)])
        coeff[s] = coeff[s][:, order] * generator.choice([-1.0, 1.0], size=order.size)
        occ[s] = occ[s][order]
        if energy is not None:
            energy[s] = energy[s][order]
    changed = replace(solution, mo_coeff=coeff, mo_occ=occ, mo_energy=energy)
    if solution.t1 is None:
        return changed
    flips = [amplitude_moves(generator, t.shape) for t in solution.t1]
    t1 = tuple(o.T @ t @ v for t, (o, v) in zip(solution.t1, flips, strict=True))
    pairs = [(0, 0)] if len(solution.t2) == 1 else [(0, 0), (0, 1), (1, 1)]
    t2 = tuple(
        np.einsum("ijab,ik,jl,ac,bd->klcd", t, flips[p][0], flips[q][0], flips[p][1], flips[q][1])
        for t, (p, q) in zip(solution.t2, pairs, strict=True)
    )
    return replace(changed, t1=t1, t2=t2)


def amplitude_moves(generator, shape):
    """Signed permutations of the occupied and of the empty orbitals of a block of amplitudes."""
    return [np.eye(n)[:, generator.permutation(n)] * generator.choice([-1.0, 1.0], size=n) for n in shape]


@pytest.mark.parametrize("name", DIAGNOSTICS)
def test_phases_and_order_of_orbitals_do_not_matter(name, solutions):
    """A diagnostic is the same whatever signs and order the engine gave the orbitals."""
    for case, solution in solutions.items():
        before = DIAGNOSTICS[name].evaluate(solution)
        after = DIAGNOSTICS[name].evaluate(turned(solution, np.random.default_rng(1)))

        assert after == (before if isinstance(before, Absent) else pytest.approx(before, abs=1e-10)), case


TWINS = {
    "both hydrogen atoms of water": (*WATER, [0, 2, 1], "RHF", "CCSD(T)", {}),
    "both atoms of broken H2": (*diatomic("H", "H", 4.0), [1, 0], "UHF", "none", {}),
    "both atoms of stretched H2": (*diatomic("H", "H", 3.4), [1, 0], "CASSCF", "none", {}),
}


@pytest.mark.parametrize("case", TWINS)
def test_the_order_of_equivalent_atoms_does_not_matter(case, tmp_path):
    """Every diagnostic is the same when equivalent atoms change places (to 1e-5: converged amplitudes)."""
    symbols, positions, order, reference, correlation, more = TWINS[case]
    bench = Bench(tmp_path)
    one, other = (
        bench.compute(symbols, [positions[i] for i in places], reference, correlation, basis=SMALL, **more)
        for places in (range(len(symbols)), order)
    )

    assert one.diagnostics == pytest.approx(other.diagnostics, abs=1e-5)
    assert one.absent == other.absent


def test_thresholds_exist_for_known_diagnostics_only():
    """A threshold without its diagnostic would never be used."""
    assert set(THRESHOLDS) <= set(DIAGNOSTICS)


def test_evaluate_all_leaves_none_out(solutions):
    """Every diagnostic that comes with a level has a value or a reason, never both."""
    for case, solution in solutions.items():
        values, absent = evaluate_all(solution)

        assert sorted([*values, *absent]) == sorted(n for n, d in DIAGNOSTICS.items() if not d.calculation), (
            case
        )


@pytest.fixture(scope="module")
def engines_own():
    """The engine's own coupled cluster of the same water, frozen core."""
    symbols, positions = WATER
    atoms = list(zip(symbols, positions, strict=True))
    mole = gto.M(atom=atoms, unit="Bohr", basis=SMALL, verbose=0)
    return cc.CCSD(scf.RHF(mole).run(conv_tol=1e-11), frozen=1).run(conv_tol=1e-10, conv_tol_normt=1e-8)


@pytest.mark.parametrize("name", ["t1", "d1", "d2"])
def test_amplitude_diagnostics_agree_with_the_engines_own(name, engines_own, solutions):
    """T1, D1 and D2 are what the engine's own functions give (1e-6: both converge amplitudes to 1e-7)."""
    own = getattr(engines_own, f"get_{name}_diagnostic")()

    assert DIAGNOSTICS[name].evaluate(solutions["closed shell, CCSD(T)"]) == pytest.approx(own, abs=1e-6)


def test_the_norm_of_singles_cannot_exceed_their_largest_singular_value(solutions):
    """T1 <= D1 / sqrt(2), by the definitions (Lee, Chem. Phys. Lett. 372, 362 (2003); from memory)."""
    values, _ = evaluate_all(solutions["closed shell, CCSD(T)"])

    assert 0.0 < values["t1"] <= values["d1"] / np.sqrt(2.0)


def test_equal_blocks_of_both_spins_give_the_closed_shell_t1(solutions):
    """A closed shell written with spin blocks has the same T1."""
    closed = solutions["closed shell, CCSD(T)"]
    by_spin = replace(closed, t1=closed.t1 * 2, t2=closed.t2 * 3)

    assert DIAGNOSTICS["t1"].evaluate(by_spin) == pytest.approx(DIAGNOSTICS["t1"].evaluate(closed), abs=1e-14)
