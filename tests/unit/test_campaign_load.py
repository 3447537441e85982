"""What a good campaign file becomes."""

from pathlib import Path

import numpy as np
import pytest
from campaigns import GOOD, changed, load, load_text
from scission import units
from scission.campaign import CampaignError, Level, Molecule, Problem, load_campaign
from scission.campaign.problems import MISSING


def test_the_file_is_kept_as_given(tmp_path: Path) -> None:
    """Text and folder of the file stay with the campaign."""
    text = (
        "# a remark\n"
        + (Path(__file__).parents[2] / "config" / "README.md")
        .read_text()
        .split("```yaml\n")[1]
        .split("```")[0]
    )
    campaign = load_text(text, tmp_path)

    assert (campaign.source_text, campaign.directory) == (text, tmp_path)


def test_positions_are_in_bohr(tmp_path: Path) -> None:
    """Coordinates in angstrom are converted once, at the edge."""
    molecule = load(GOOD, tmp_path).molecules["hydrogen"]

    assert molecule.symbols == ("H", "H")
    assert molecule.positions[1] == pytest.approx([0.0, 0.0, 0.7414 * units.ANGSTROM_IN_BOHR], rel=1e-15)


def test_coordinates_in_bohr_stay(tmp_path: Path) -> None:
    """With unit: bohr the numbers of the file are the positions."""
    atoms = {"charge": 0, "multiplicity": 1, "unit": "bohr", "atoms": "H 0 0 0\nH 0 0 1.4"}
    molecule = load(changed(("molecules/hydrogen", atoms)), tmp_path).molecules["hydrogen"]

    assert np.array_equal(molecule.positions, [[0, 0, 0], [0, 0, 1.4]])


def test_an_xyz_file_is_read_from_beside_the_campaign(tmp_path: Path) -> None:
    """The path is relative to the campaign file, and the file in angstrom whatever the unit of lengths."""
    (tmp_path / "h2.xyz").write_text("2\nhydrogen\nH 0 0 0\nH 0 0 0.7414\n\n")
    atoms = {"charge": 0, "multiplicity": 1, "unit": "bohr", "xyz": "h2.xyz"}
    molecule = load(changed(("molecules/hydrogen", atoms)), tmp_path).molecules["hydrogen"]

    assert molecule.positions[1, 2] == pytest.approx(0.7414 * units.ANGSTROM_IN_BOHR, rel=1e-15)


def test_defaults(tmp_path: Path) -> None:
    """Optional keys have the documented defaults."""
    campaign = load(changed(("diagnostics", None), ("fit", None)), tmp_path)
    level = campaign.levels["dft"]

    assert (level.correlation, level.frozen_core, level.states, level.follow) == ("none", True, 1, None)
    assert campaign.fit.models == ["morse", "extended-rydberg"]
    assert (campaign.diagnostics.thresholds, campaign.reference_level) == ({}, None)


@pytest.mark.parametrize(
    ("reference", "follow", "resolved"),
    [("RHF", None, "anchor"), ("CASSCF", None, "anchor"), ("UHF", None, "lowest"), ("UKS", None, "lowest"),
     ("UHF", "anchor", "anchor"), ("CASSCF", "lowest", "lowest")],
)  # fmt: skip
def test_which_state_is_followed(reference: str, follow: str | None, resolved: str) -> None:
    """Unrestricted references take the lowest solution unless told otherwise, the others follow."""
    level = Level.model_validate({"reference": reference, "basis": "STO-3G", "follow": follow})

    assert level.resolved_follow == resolved


def test_null_correlation_means_none() -> None:
    """A null reads like the word."""
    level = Level.model_validate({"reference": "RHF", "basis": "STO-3G", "correlation": None})

    assert level.correlation == "none"


def test_a_basis_per_element() -> None:
    """Elements without an entry take the default, or have none."""
    level = Level(reference="RHF", basis={"H": "STO-3G", "default": "cc-pVDZ"})

    assert (level.basis_of("H"), level.basis_of("O")) == ("STO-3G", "cc-pVDZ")
    assert Level(reference="RHF", basis={"H": "STO-3G"}).basis_of("O") is None


def test_nitric_oxide_is_a_name_and_small_numbers_are_numbers(tmp_path: Path) -> None:
    """NO is no truth value here, and 1e-3 no text."""
    text = """
campaign: nitric
molecules: {NO: {charge: 0, multiplicity: 2, atoms: "N 0 0 0\\nO 0 0 1.15"}}
levels: {uhf: {reference: UHF, basis: {N: STO-3G, O: STO-3G}}}
scans: {s: {molecule: NO, levels: [uhf], stretch: {bond: [N1, O2], lengths: [11e-1, +1.2e0]}}}
"""
    campaign = load_text(text, tmp_path)

    assert campaign.scans["s"].molecule == "NO"
    assert campaign.scans["s"].stretch.lengths == [1.1, 1.2]  # type: ignore[union-attr]


def test_aliases_are_followed(tmp_path: Path) -> None:
    """A block may be written once and used twice."""
    text = """
campaign: alias
molecules: {h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}}
levels: {a: &a {reference: RHF, basis: STO-3G}, b: *a}
scans: {s: {molecule: h2, levels: [a, b], stretch: {bond: [H1, H2], lengths: [0.7]}}}
"""
    campaign = load_text(text, tmp_path)

    assert campaign.levels["a"] == campaign.levels["b"]


def test_a_byte_order_mark_is_no_problem(tmp_path: Path) -> None:
    """Some editors put one in front of UTF-8."""
    text = (
        (Path(__file__).parents[2] / "config" / "README.md").read_text().split("```yaml\n")[1].split("```")[0]
    )

    assert load_text(b"\xef\xbb\xbf" + text.encode(), tmp_path).name == "water-bond"


def test_diagnostics_are_checked_against_the_registry(tmp_path: Path) -> None:
    """Without a list of names the program's own diagnostics are the known ones."""
    load(GOOD, tmp_path)
    file = tmp_path / "campaign.yaml"
    file.write_text(file.read_text().replace("thresholds: {}", "include: [t1, nothing]"))
    with pytest.raises(CampaignError) as caught:
        load_campaign(file)

    assert [problem.path for problem in caught.value.problems] == ["diagnostics.include[1]"]


def test_a_molecule_by_itself_has_its_atoms() -> None:
    """A molecule made in Python from text needs no file."""
    molecule = Molecule(charge=0, multiplicity=1, atoms="He 0 0 0")

    assert (molecule.symbols, molecule.positions.shape) == (("He",), (1, 3))


def test_a_problem_reads_as_a_sentence() -> None:
    """Path, value and rule; no value where the key is missing; long values cut."""
    assert str(Problem("a.b", 1, "is too small")) == "a.b: 1 is too small"
    assert str(Problem("a.b", MISSING, "is missing")) == "a.b: is missing"
    assert len(str(Problem("a", "x" * 1000, "is long"))) < 100
