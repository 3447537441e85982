"""The far end of a level in words."""

import numpy as np
import pytest
from scission.analysis.limits import Sums, far_limit
from scission.analysis.scan import LevelResult
from scission.campaign import Level
from scission.records import Record
from scission.units import ANGSTROM_IN_BOHR, HARTREE_IN_KCAL_PER_MOL
from synthetic_campaign import Planned

ATOMS = Sums(-100.0, -99.5, "H doublet + F doublet", "H+ + F-")
CLOSED = Sums(-100.0, -99.5, "NH3 singlet + BH3 singlet", "NH3+ + BH3-", open_shell=False)
LENGTHS = (0.7, 0.9, 1.2, 2.0, 5.0, 10.0)


def judged(reference, far, sums=ATOMS, correlation="none", lengths=LENGTHS, s2=0.0, spin=0.0):
    """The limit of a well whose energy far out is ``far`` above the fragments, hartree."""
    basis = {"basis": "cc-pVDZ", "reference": reference, "correlation": correlation}
    level = Level.model_validate(basis | ({"active_space": "auto"} if reference == "CASSCF" else {}))
    depth = [0.1, -0.2, -0.1, -0.05, *[0.0] * (len(lengths) - 4)]
    points = [Planned("s", "l", i, (x,), ("bond",), f"k{i}") for i, x in enumerate(lengths, 1)]
    records = [
        Record(p.key, "point", "converged", scalars={"energy": -100.0 + far + e}, diagnostics={"s2": s2})
        for p, e in zip(points, depth, strict=True)
    ]
    return far_limit(LevelResult("l", level, points, records), sums, spin)


def test_right_limit_is_called_by_its_fragments():
    """Within 1 kcal/mol of the sum."""
    limit = judged("CASSCF", 0.5 / HARTREE_IN_KCAL_PER_MOL)

    assert limit.kind == "fragments"
    assert "H doublet + F doublet" in limit.what
    assert limit.difference * HARTREE_IN_KCAL_PER_MOL == pytest.approx(0.5)


def test_broken_spin_is_told_with_its_number():
    """UHF at <S^2> = 1 has the energy of the fragments but the spin of none."""
    limit = judged("UHF", 0.0, s2=1.0)

    assert limit.kind == "fragments, broken spin"
    assert "<S^2> is 1.00" in limit.what


def test_spin_of_a_proper_open_shell_is_no_fault():
    """A doublet at 0.75 is what was asked for."""
    assert judged("UHF", 0.0, s2=0.75, spin=0.5).kind == "fragments"


def test_ions_are_recognised_by_their_energy_and_attraction():
    """An energy of the separate ions with -1/R is ionic."""
    limit = judged("RHF", 0.5 - 1.0 / (10.0 * ANGSTROM_IN_BOHR))

    assert limit.kind == "ionic"
    assert "H+ + F-" in limit.what


def test_ionic_part_of_a_closed_shell_is_named():
    """Between atoms and ions the closed shell is a mixture; a closed-shell pair of fragments is not."""
    assert judged("RHF", 0.3).kind == "part ionic"
    assert "keeps ionic terms" in judged("RHF", 0.3).what
    assert judged("RHF", 0.3, CLOSED).kind == "too high"
    assert judged("UHF", 0.3).kind == "too high"


def test_correlation_on_a_broken_closed_shell_breaks_down_or_stays_wrong():
    """Below the fragments it breaks down; above them it has the reference's wrong limit."""
    assert judged("RHF", -0.03, correlation="CCSD(T)").kind == "breaks down"
    assert judged("RHF", 0.03, correlation="CCSD").kind == "wrong limit"
    assert judged("UHF", -0.03, correlation="CCSD").kind == "too low"


def test_short_scans_are_not_judged():
    """A scan that ends at 3 angstrom says so."""
    limit = judged("RHF", 0.3, lengths=(0.7, 0.9, 1.2, 2.0, 3.0))

    assert limit.kind == "not separated"
    assert "3.00 angstrom" in limit.what


def test_missing_fragments_leave_the_limit_unknown():
    """Without a sum there is no judgement, but the reason."""
    limit = judged("RHF", 0.0, Sums(problem="a fragment has no record"))

    assert limit.kind == "unknown"
    assert "no record" in limit.what
    assert np.isnan(limit.difference)
