"""Published values of diagnostics and of energies that other programs have given."""

import published
import pytest
from chemistry_support import Bench, angstrom, diatomic
from scission.units import ANGSTROM_IN_BOHR

N2 = diatomic(
    "N", "N", published.value("spectroscopic_constants", system="N2", quantity="r_e") * ANGSTROM_IN_BOHR
)
WATER = (["O", "H", "H"], angstrom((0.0, 0.0, 0.1173), (0.0, 0.7572, -0.4692), (0.0, -0.7572, -0.4692)))
ORIGIN = [[0.0, 0.0, 0.0]]


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """One bench for all."""
    return Bench(tmp_path_factory.mktemp("diagnostics"))


@pytest.fixture(scope="module")
def nitrogen(bench):
    """N2, CCSD(T)/cc-pVTZ, frozen core."""
    return bench.compute(*N2, "RHF", "CCSD(T)", frozen_core=True, basis="cc-pvtz")


def test_t1_of_nitrogen(nitrogen):
    """RCCSD/cc-pVTZ, frozen core, published to three decimals: half a unit of the last."""
    assert nitrogen.diagnostics["t1"] == pytest.approx(
        published.value("diagnostics", quantity="T1"), abs=5e-4
    )


@pytest.mark.parametrize(
    ("method", "system"), [("CCSD", "ROCCSD/cc-pVTZ C"), ("CCSD(T)", "ROCCSD(T)/cc-pVTZ C")]
)
def test_open_shell_coupled_cluster_of_the_carbon_atom(bench, method, system):
    """ROHF-based, frozen core, semicanonical triples; 5e-9, as iterations are converged to 1e-9."""
    energy = bench.energy(["C"], ORIGIN, "ROHF", method, frozen_core=True, basis="cc-pvtz", multiplicity=3)

    assert energy == pytest.approx(published.value("diagnostics", system=system), abs=5e-9)


def share_of_triples(bench, molecule, atoms):
    """100 (TAE[CCSD(T)] - TAE[CCSD]) / TAE[CCSD(T)]; the difference is what the triples give each part."""
    parts = [bench.compute([a], ORIGIN, "ROHF", "CCSD(T)" if a != "H" else "none", frozen_core=True,
                           basis="cc-pvtz", multiplicity=m) for a, m in atoms]  # fmt: skip
    total, triples = (
        sum(p.scalars.get(name, 0.0) for p in parts) - molecule.scalars[name]
        for name in ("energy", "energy_triples")
    )
    return 100.0 * triples / total


@pytest.mark.slow
def test_share_of_triples_in_the_binding_of_nitrogen(bench, nitrogen):
    """%TAE[(T)] of N2, published near the basis limit.

    Triples converge from below: cc-pVTZ recovers nine tenths (Karton et al. (2006), from memory), so our
    value may lie up to 15 percent below the published one, which is rounded to 0.1 as well.
    """
    share = share_of_triples(bench, nitrogen, [("N", 4), ("N", 4)])
    limit = published.value("diagnostics", quantity="%TAE[(T)]", system="N2")

    assert 0.85 * limit - 0.05 < share < limit + 0.05


@pytest.mark.slow
def test_share_of_triples_in_the_binding_of_water(bench):
    """%TAE[(T)] of H2O; tolerance as for N2."""
    molecule = bench.compute(*WATER, "RHF", "CCSD(T)", frozen_core=True, basis="cc-pvtz")
    share = share_of_triples(bench, molecule, [("O", 3), ("H", 2), ("H", 2)])
    limit = published.value("diagnostics", quantity="%TAE[(T)]", system="H2O")

    assert 0.85 * limit - 0.05 < share < limit + 0.05
