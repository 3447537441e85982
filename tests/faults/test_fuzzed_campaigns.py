"""Campaign files changed at random, through all of ``scission check``: told apart, never a traceback."""

import contextlib
import io
import tempfile
from pathlib import Path

from campaigns import GOOD
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scission.cli import main

TEXT = """\
campaign: small
molecules:
  water: {charge: 0, multiplicity: 1, atoms: "O 0 0 0.1173\\nH 0 0.7572 -0.4692\\nH 0 -0.7572 -0.4692"}
  hydroxyl: {charge: 0, multiplicity: 2, unit: angstrom, atoms: "O 0 0 0\\nH 0 0 0.97"}
levels:
  cc: {reference: RHF, correlation: CCSD(T), basis: cc-pVDZ, frozen_core: true}
  ucc: {reference: UHF, correlation: CCSD, basis: cc-pVDZ}
  cas: {reference: CASSCF, active_space: {electrons: 2, orbitals: 2}, correlation: NEVPT2, basis: cc-pVDZ}
scans:
  one-oh:
    molecule: water
    levels: [cc, cas]
    stretch: {bond: [O1, H2], lengths: {from: 0.7, to: 10.0, points: 8, spacing: graded}}
  radical: {molecule: hydroxyl, levels: [ucc], stretch: {bond: [O1, H2], lengths: [0.9, 1.0]}}
"""
SETTINGS = settings(max_examples=60, deadline=10000, suppress_health_check=[HealthCheck.too_slow])
WORDS = [*sorted({str(name) for block in ("levels", "molecules") for name in GOOD[block]})]
WORDS += ["RHF", "UKS", "CASSCF", "FCI", "MP2", "auto", "sto-3g", "cc-pVQZ", "def2-SVP", "He", "U", "Xe"]
NUMBERS = ["0", "-1", "2", "3", "1e3", "99999999", "1e400", ".nan", ".inf", "0.001", "1000000", "250000"]
BITS = st.one_of(st.sampled_from(WORDS), st.sampled_from(NUMBERS), st.text(max_size=6))


def check(text, *options):
    """Exit status of ``scission check`` on a text, and everything it said."""
    said = io.StringIO()
    with tempfile.TemporaryDirectory() as name:
        path = Path(name) / "campaign.yaml"
        path.write_bytes(text.encode("utf-8", "surrogatepass"))
        with contextlib.redirect_stdout(said), contextlib.redirect_stderr(said):
            status = main(["check", str(path), "--results", name, *options])
    return status, said.getvalue()


def tokens(text):
    """The pieces of a text between which words and numbers can be exchanged."""
    for mark in "{}[],:\n":
        text = text.replace(mark, f"\0{mark}\0")
    return text.split("\0")


def test_the_file_that_is_changed_is_a_good_one():
    """Otherwise every change would end alike."""
    status, said = check(TEXT)

    assert status == 0
    assert "core hours" in said


@SETTINGS
@given(st.lists(st.tuples(st.integers(0, len(tokens(TEXT)) - 1), BITS), min_size=1, max_size=3))
def test_a_word_in_place_of_any_other_gives_a_plan_or_a_clear_error(changes):
    """Exit 0 with a forecast, or 2 with what is wrong."""
    parts = tokens(TEXT)
    for place, bit in changes:
        parts[place] = f" {bit}"
    status, said = check("".join(parts))

    assert ("core hours" in said) if status == 0 else (status == 2 and len(said.strip()) > 20)


@SETTINGS
@given(st.one_of(st.integers(0, 60), st.integers(0, 10**9)), st.integers(1, 12), st.floats(0.01, 1e6))
def test_any_grid_ends_at_once(points, seconds, longest):
    """Grids of any size are planned, or refused before they are built."""
    grid = f"{{from: 0.7, to: {longest!r}, points: {points}, spacing: even}}"
    text = TEXT.replace("{from: 0.7, to: 10.0, points: 8, spacing: graded}", grid)
    status, said = check(text, "--most-points", "2000", "--block-seconds", str(seconds))

    assert status in (0, 2)
    assert status == 2 or points <= 1000
    assert "points" in said or "lengths" in said


@SETTINGS
@given(
    st.sampled_from(["sto-3g", "cc-pVDZ", "aug-cc-pV5Z", "def2-QZVPP"]),
    st.integers(1, 60),
    st.integers(1, 60),
)
def test_any_active_space_is_forecast_or_refused(basis, electrons, orbitals):
    """Also those whose determinants no computer could count one by one."""
    space = f"active_space: {{electrons: {electrons}, orbitals: {orbitals}}}"
    text = TEXT.replace("active_space: {electrons: 2, orbitals: 2}", space)
    text = text.replace("NEVPT2, basis: cc-pVDZ", f"NEVPT2, basis: {basis}")
    status, said = check(text)

    assert status in (0, 2)
    assert "core hours" in said or "active_space" in said or "levels" in said
