"""Orbital Hessians: their lowest eigenvalues, and integrals that are shared between visits of a geometry."""

import numpy as np
import pytest
from chemistry_support import Bench, diatomic, task
from pyscf import dft, scf
from pyscf.soscf import newton_ah
from scission.chemistry import integrals, stability
from scission.chemistry.molecule import build_mole
from scission.chemistry.scf import build_field, converge, follow_instability

N2 = {"symbols": ["N", "N"], "charge": 0, "multiplicity": 1}
O2 = {"symbols": ["O", "O"], "charge": 0, "multiplicity": 3}


def _mole(facts, length_bohr, basis="sto-3g"):
    positions = np.array([[0.0, 0.0, 0.0], [0.0, 0.0, length_bohr]])
    return build_mole(facts, dict.fromkeys(facts["symbols"], basis), positions)


def _converged(facts, reference, length_bohr, functional=None):
    spec = {"reference": reference, "functional": functional}
    field = build_field(_mole(facts, length_bohr), spec)
    field.kernel()
    return field


@pytest.mark.parametrize(
    ("facts", "reference", "functional"),
    [(N2, "RHF", None), (N2, "UHF", None), (O2, "UHF", None), (O2, "ROHF", None), (N2, "UKS", "B3LYP")],
)
def test_the_lowest_eigenvalue_is_that_of_the_whole_matrix(facts, reference, functional):
    """The search gives what diagonalising the whole orbital Hessian gives (numpy's dense eigenvalues)."""
    field = _converged(facts, reference, 3.6, functional)
    kind = {"RHF": "rhf", "UHF": "uhf", "UKS": "uhf", "ROHF": "rohf"}[reference]
    _, times, diagonal = getattr(newton_ah, f"gen_g_hop_{kind}")(field, field.mo_coeff, field.mo_occ)
    matrix = np.array([2.0 * times(row) for row in np.eye(len(diagonal))])
    lowest = np.linalg.eigvalsh((matrix + matrix.T) / 2.0)[0]

    found, _ = stability.internal_instability(field)

    assert found == pytest.approx(lowest, abs=1e-4)


def test_following_an_instability_ends_in_a_minimum():
    """The closed determinant of stretched N2 is no minimum among unrestricted ones; what it leads to is one."""
    restricted = _converged(N2, "RHF", 3.6)
    value, vector = stability.triplet_instability(restricted)
    start = stability.unrestricted_along(restricted, vector)
    field = converge(build_field(restricted.mol, {"reference": "UHF"}), start.density())
    lower, curvature = follow_instability(field)

    assert value < -0.1
    assert lower.e_tot < restricted.e_tot - 0.1
    assert curvature > stability.UNSTABLE


def test_turning_along_a_vector_keeps_orbitals_orthonormal():
    """A rotation keeps the overlaps of orbitals (exact)."""
    field = _converged(O2, "UHF", 2.3)
    _, vector = stability.internal_instability(field)
    overlap = field.get_ovlp()

    for coeff in stability.turned_along(field, 3.0 * vector):
        assert np.allclose(coeff.T @ overlap @ coeff, np.eye(coeff.shape[1]), atol=1e-10)


def test_integrals_are_shared_at_a_geometry_and_not_beyond():
    """Two fields of one geometry hold the same integrals, whatever their electrons; they are the engine's."""
    neutral = build_field(_mole(N2, 2.1), {"reference": "RHF"})
    cation = build_field(_mole({**N2, "charge": 1, "multiplicity": 2}, 2.1), {"reference": "UHF"})
    elsewhere = build_field(_mole(N2, 2.2), {"reference": "RHF"})

    assert neutral._eri is cation._eri
    assert elsewhere._eri is not neutral._eri
    assert np.array_equal(neutral._eri, neutral.mol.intor("int2e", aosym="s8"))


def test_no_more_integrals_are_kept_than_there_is_room_for(monkeypatch):
    """Beyond the room the geometry that was not used for longest goes; the latest one stays in any case."""
    monkeypatch.setattr(integrals, "KEPT_BYTES", 1.0)
    integrals.forget()
    first = build_field(_mole(N2, 2.31), {"reference": "RHF"})
    build_field(_mole(N2, 2.32), {"reference": "RHF"})
    again = build_field(_mole(N2, 2.31), {"reference": "RHF"})

    assert again._eri is not first._eri
    assert len(integrals._repulsion) == 1


def test_a_shared_grid_gives_the_energy_of_the_engine():
    """Kohn-Sham on a shared grid has the energy of the engine's own object (PySCF, same functional)."""
    mole = _mole(N2, 2.1)
    own = dft.RKS(mole, xc="B3LYP").run(conv_tol=1e-10)
    fields = [build_field(mole, {"reference": "RKS", "functional": "B3LYP"}) for _ in range(2)]
    energies = [field.kernel() for field in fields]

    assert fields[0].grids is fields[1].grids
    assert energies == pytest.approx([own.e_tot] * 2, abs=1e-9)


def test_far_fragments_are_computed_once(monkeypatch):
    """A fragment is the same at every length of the bond: its solutions are not computed again."""
    from scission.chemistry import fragments

    fragments._alone.cache_clear()
    kernels = []
    original = scf.uhf.UHF.kernel
    monkeypatch.setattr(
        scf.uhf.UHF, "kernel", lambda self, *a, **k: kernels.append(1) or original(self, *a, **k)
    )
    basis = {"N": "sto-3g"}
    for length in (4.0, 6.0):
        fragments.promising_splits(N2, basis, np.array([[0.0, 0.0, 0.0], [0.0, 0.0, length]]), [[0], [1]])
        if length == 4.0:
            once = len(kernels)

    assert 0 < once == len(kernels)


@pytest.mark.parametrize(("step", "status"), [(0.0, "converged"), (-0.05, "failed")])
def test_no_reference_lies_below_the_exact_energy(tmp_path, step, status):
    """The energy of H2 in a basis is bounded by full CI (variation principle); one that is lower is refused."""
    bench, h2 = Bench(tmp_path), task("r0001", *diatomic("H", "H", 1.4), "UHF", basis="cc-pvdz")
    record = bench.run(h2)
    record.scalars["energy"] += step
    bench.store.write(record)
    finished = bench.run({**h2, "kind": "finish"})

    assert finished.status == status
    assert (finished.reason == "bound-violated") == (status == "failed")
