"""Fragments computed by the program against the far end of its own scans, and against known atoms."""

import pytest
from in_process import attempt_task, compute, tables
from scission.analysis import analyse
from scission.plan import make_plan

TEXT = """
campaign: fragments
molecules:
  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}
  lih: {charge: 0, multiplicity: 1, atoms: "Li 0 0 0\\nH 0 0 1.6"}
levels:
  rhf: {reference: RHF, basis: 6-31g}
  uhf: {reference: UHF, basis: 6-31g}
  ump: {reference: UHF, correlation: MP2, basis: 6-31g}
  cas: {reference: CASSCF, active_space: auto, basis: 6-31g}
  nev: {reference: CASSCF, active_space: auto, correlation: NEVPT2, basis: 6-31g}
  fci: {reference: RHF, correlation: FCI, basis: 6-31g}
  pair: {reference: PAIR, basis: 6-31g}
  orbital: {reference: ORBITAL, basis: 6-31g}
scans:
  h2:
    molecule: h2
    levels: [rhf, uhf, ump, nev, fci, pair, orbital]
    stretch: {bond: [H1, H2], lengths: [0.6, 0.74, 0.9, 2.0, 10.0]}
  lih:
    molecule: lih
    levels: [cas, nev, fci]
    stretch: {bond: [Li1, H2], lengths: [1.5, 1.6, 1.8, 3.2, 10.0]}
"""
SMALL = """
campaign: small
molecules: {h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}}
levels: {rhf: {reference: RHF, basis: 6-31g}, cc: {reference: RHF, correlation: CCSD, basis: 6-31g}}
scans: {h2: {molecule: h2, levels: [rhf, cc], stretch: {bond: [H1, H2], lengths: [0.7, 0.8]}}}
"""
SIZE_CONSISTENT = [("h2", name) for name in ("uhf", "ump", "nev", "fci", "pair")]
SIZE_CONSISTENT += [("lih", name) for name in ("cas", "nev", "fci")]


@pytest.fixture(scope="module")
def analysis(tmp_path_factory):
    return tables(TEXT, tmp_path_factory.mktemp("campaign"))


def limit(analysis, scan, level):
    table = analysis.frames["limits"]
    return next(table[(table.scan == scan) & (table.level == level)].itertuples())


@pytest.mark.parametrize(("scan", "level"), SIZE_CONSISTENT)
def test_size_consistent_levels_end_at_their_fragments(analysis, scan, level):
    """The far energy is the fragments' to 1e-3 kcal/mol: definition of size consistency."""
    row = limit(analysis, scan, level)

    assert row.difference_kcal_per_mol == pytest.approx(0.0, abs=1e-3)
    assert row.limit.startswith("fragments")
    assert row.remark == ""


def test_closed_shells_end_part_ionic(analysis):
    """RHF and the orbital picture of H2 end several eV above two atoms, and say why."""
    for level in ("rhf", "orbital"):
        row = limit(analysis, "h2", level)

        assert row.limit == "part ionic"
        assert 5.0 < row.difference_ev < 9.0


def test_depth_against_fragments_is_in_the_fits(analysis):
    """D_e of full CI is fragment sum minus minimum, and one row of the fits says so."""
    fits = analysis.frames["fits"]
    row = fits[(fits.scan == "h2") & (fits.level == "fci") & (fits.model == "fragments")]
    points = analysis.frames["points"]
    bottom = points[(points.scan == "h2") & (points.level == "fci")].relative_energy_ev.max()

    assert len(row) == 1
    assert row.value.iloc[0] == pytest.approx(limit(analysis, "h2", "fci").d_e_ev)
    assert row.value.iloc[0] == pytest.approx(bottom, abs=0.02)


def test_bond_pictures_are_in_their_table(analysis):
    """Active spaces, full CI of two electrons and the pictures have weights at every point."""
    table = analysis.frames["bond_picture"]
    found = table[table.quantity == "bond_covalent"].groupby(["scan", "level"]).size().to_dict()
    levels = [("h2", name) for name in ("nev", "fci", "pair", "orbital")] + [("lih", "cas"), ("lih", "nev")]

    assert found == dict.fromkeys(levels, 5)


def test_full_ci_and_active_space_draw_one_picture(analysis):
    """Of two electrons, the two forms of the wavefunction agree within what the space leaves out."""
    table = analysis.frames["bond_picture"]
    near = table[(table.scan == "h2") & (table.point == 2) & (table.quantity == "bond_covalent")]
    values = near.set_index("level").value

    assert values["fci"] == pytest.approx(values["nev"], abs=0.02)


def test_a_fragment_is_computed_once(tmp_path):
    """Every planned fragment has a record; a task that is run on a whole store changes no energy."""
    campaign, store = compute(SMALL, tmp_path)
    jobs = [job for job in make_plan(campaign).jobs if job.stage == "fragments"]
    items = [item for job in jobs for item in job.payload["points"]]

    assert store.keys("fragment") == {item["key"] for item in items}
    before = store.read("fragment", items[0]["key"]).scalars["energy"]
    attempt_task(items[0], store)
    assert store.read("fragment", items[0]["key"]).scalars["energy"] == pytest.approx(before, abs=1e-9)
    assert len(analyse(make_plan(campaign).points, campaign, store).frames["limits"]) == 2
