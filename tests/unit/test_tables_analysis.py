"""Records, thresholds and curves come together in tables without losing a point."""

from types import SimpleNamespace

import numpy as np
import pytest
from scission.analysis import analyse
from scission.analysis.scan import copes
from scission.records import Store
from scission.tables import read_failures, write_tables
from synthetic_campaign import TEXT, WELLS, broken, campaign, failed, fill, lengths, points, record


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    return tmp_path_factory.mktemp("campaign")


@pytest.fixture(scope="module")
def analysis(folder):
    store = Store(folder)
    return analyse(fill(store), campaign(folder), store, {"physics_version": 1, "digest": "abc"})


def row(table, **wanted):
    for name, value in wanted.items():
        table = table[table[name] == value]
    assert len(table) == 1
    return table.iloc[0]


def test_every_planned_point_has_one_row(analysis):
    """Also the ones that failed and the one that left nothing."""
    table = analysis.frames["points"]
    where = list(zip(table.scan, table.level, table.point, strict=True))

    assert sorted(where) == sorted((p.scan, p.level, p.number) for p in points())
    assert row(table, scan="n-n", level="cas", point=7).status == "lost"


def test_two_scans_that_share_a_record_have_a_row_each(tmp_path):
    """A shared key is one calculation and two rows."""
    planned = [SimpleNamespace(**vars(p) | {"scan": scan}) for scan in ("h-f", "again") for p in points()[:5]]
    text = TEXT + TEXT[TEXT.index("  h-f:") : TEXT.index("  n-n:")].replace("h-f:", "again:")
    store = Store(tmp_path)
    for point in points()[:5]:
        store.write(record(point))
    table = analyse(planned, campaign(tmp_path, text), store).frames["points"]

    assert len(table) == 10
    assert table.key.nunique() == 5
    assert (table.status == "converged").all()


def test_failures_are_exactly_the_points_without_a_result(analysis, folder):
    """And the file can be read back to be computed again."""
    write_tables(analysis.frames, folder)
    table = analysis.frames["points"]
    bad = table[table.status != "converged"]
    listed = read_failures(folder / "failures.csv")

    assert [(f.scan, f.level, f.point) for f in listed] == list(
        zip(bad.scan, bad.level, bad.point, strict=True)
    )
    assert analysis.n_failures == len(listed)


def test_an_energy_that_did_not_converge_is_no_energy(tmp_path):
    """The last energy of an unfinished iteration stays out of the tables; the cost does not."""
    store, point = Store(tmp_path), points()[0]
    store.write(failed(point))
    table = analyse([point], campaign(tmp_path), store).frames["points"]

    assert np.isnan(table.energy_hartree[0])
    assert np.isnan(table.relative_energy_ev[0])
    assert table.wall_s[0] == 1.5
    assert table.attempts[0] == 2


def test_an_onset_lies_where_the_formula_crosses(analysis):
    """LUNO = 0.03 + 0.97 x reaches 0.10 at a length known in closed form; the grid is coarse there."""
    x = 0.07 / 0.97
    exact = WELLS["n-n"][0] * (2.0 + np.log(x / (1.0 - x)) / 4.0)
    found = row(analysis.frames["onsets"], scan="n-n", level="cas", diagnostic="luno")

    assert broken("n-n", exact) == pytest.approx(x)
    assert found.onset_angstrom == pytest.approx(exact, abs=0.02)
    assert found.lower_angstrom < exact < found.upper_angstrom


def test_a_diagnostic_that_never_crosses_says_so(tmp_path):
    """None is a statement, not a missing row."""
    store, planned = Store(tmp_path), points()[:4]
    for point in planned:
        store.write(record(point))
    found = row(analyse(planned, campaign(tmp_path), store).frames["onsets"], diagnostic="d1")

    assert np.isnan(found.onset_angstrom)
    assert "within the threshold" in found.what


def test_a_morse_curve_gives_its_constants_back(analysis):
    """The records of the unrestricted level are a Morse curve: r_e and D_e are those of the formula."""
    fits = analysis.frames["fits"]
    here = {"scan": "h-f", "level": "uhf", "model": "morse"}

    assert row(fits, **here, quantity="r_e").value == pytest.approx(0.917, abs=1e-4)
    assert row(fits, **here, quantity="D_e").value == pytest.approx(0.72 * 5.9, abs=1e-3)


def test_points_left_out_of_a_fit_say_why(analysis):
    """A restricted level is not fitted where one determinant is not enough; failed points are named."""
    table = analysis.frames["residuals"]
    here = table[(table.scan == "h-f") & (table.level == "ccsd-t") & (table.model == "morse")]

    assert len(here) == 30
    assert set(here.why_left_out[~here.used.astype(bool)]) >= {
        "flagged multireference",
        "unconverged: not-converged",
    }
    assert (here.why_left_out[here.used.astype(bool)] == "").all()


def test_verdicts_use_what_other_levels_know(analysis):
    """A level without amplitudes is flagged by those of its neighbour, and says whose they are."""
    far = row(analysis.frames["points"], scan="n-n", level="uhf", point=25)

    assert far.flag == "multireference"
    assert "level ccsd-t)" in far.reasons


def test_a_lost_point_is_judged_by_the_other_levels(analysis):
    """The flag speaks of the geometry, so a point without a result has one too."""
    assert row(analysis.frames["points"], scan="n-n", level="cas", point=7).flag != "undetermined"


def test_an_override_moves_flags_and_thresholds_only(tmp_path, analysis):
    """The same records, another threshold: its source is named, the energies stay."""
    text = TEXT + "diagnostics:\n  thresholds:\n    t1: {value: 0.5, source: a study of our own}\n"
    store = Store(tmp_path)
    moved = analyse(fill(store), campaign(tmp_path, text), store)
    rows = moved.frames["diagnostics"]
    t1 = rows[(rows.diagnostic == "t1") & rows.value.notna()]

    assert set(t1.threshold) == {0.5}
    assert set(t1.threshold_source) == {"a study of our own"}
    assert not t1.over.any()
    assert moved.frames["points"].energy_hartree.equals(analysis.frames["points"].energy_hartree)


def test_a_diagnostic_without_meaning_is_empty_with_its_reason(analysis):
    """Never zero."""
    rows = analysis.frames["diagnostics"]
    absent = rows[(rows.scan == "h-f") & (rows.level == "uhf") & (rows.diagnostic == "t1")]

    assert len(absent) == 30
    assert absent.value.isna().all()
    assert absent.over.isna().all()
    assert set(absent.remark) == {"no amplitudes at this level"}


def test_several_states_have_a_row_each(tmp_path):
    """Labels follow the states, numbers their order."""
    store, point = Store(tmp_path), points()[-1]
    made = record(point)
    made.arrays = {"state_energies": np.array([-2.0, -1.0]), "state_labels": np.array([2, 1])}
    store.write(made)
    table = analyse([point], campaign(tmp_path), store).frames["states"]

    assert list(zip(table.state, table.label, table.energy_hartree, strict=True)) == [
        (1, 2, -2.0),
        (2, 1, -1.0),
    ]


def test_energies_start_at_the_well_even_if_a_level_collapses(tmp_path):
    """Restricted coupled cluster may fall below its minimum far out: the zero stays in the well."""
    store, planned = Store(tmp_path), [p for p in points() if p.scan == "h-f" and p.level == "ccsd-t"]
    for point in planned:
        made = record(point)
        made.scalars["energy"] -= 2.0 * broken("h-f", point.coordinate[0]) ** 4
        store.write(made)
    table = analyse(planned, campaign(tmp_path), store).frames["points"]
    nearest = int(np.argmin(np.abs(lengths("h-f") - WELLS["h-f"][0])))

    assert table.relative_energy_ev.min() < -10.0
    assert abs(table.relative_energy_ev[nearest]) < 0.5


def test_crossings_and_remedies_come_from_outside(tmp_path):
    """What the walk along the scan reported, and what the ladder suggests, lands in the tables."""
    store, point = Store(tmp_path), points()[0]
    store.write(failed(point))
    crossing = {"from_angstrom": 1.0, "to_angstrom": 1.1, "overlap": 0.4, "what": "another solution"}
    made = analyse(
        [point],
        campaign(tmp_path),
        store,
        suggest=lambda _: "damping",
        crossings={("h-f", "ccsd-t"): [crossing]},
    )

    assert row(made.frames["crossings"], scan="h-f", level="ccsd-t").overlap == 0.4
    assert list(made.frames["failures"].remedy) == ["damping"]


def test_records_of_different_make_are_noticed(tmp_path):
    """Two versions of the engine among the records are named."""
    store, planned = Store(tmp_path), points()[:2]
    for point, version in zip(planned, ("2.13", "2.14"), strict=True):
        made = record(point)
        made.provenance["pyscf"] = version
        store.write(made)
    analysis = analyse(planned, campaign(tmp_path), store)

    assert analysis.mixed == ["pyscf"]
    assert analysis.provenance["records_pyscf"] == "2.13, 2.14"


@pytest.mark.parametrize(
    ("reference", "correlation", "n_correlated", "expected"),
    [
        ("RHF", "CCSD(T)", 10, False),
        ("RHF", "CCSD", 2, True),
        ("RHF", "MP2", 2, False),
        ("RHF", "FCI", 10, True),
        ("CASSCF", "NEVPT2", 10, True),
        ("UHF", "none", None, True),
        ("RKS", "none", None, False),
    ],
)
def test_which_levels_keep_one_well(reference, correlation, n_correlated, expected):
    """Coupled cluster is exact for two electrons, so it is fitted to the far end (textbook result)."""
    scalars = {} if n_correlated is None else {"n_correlated": n_correlated}

    assert copes(SimpleNamespace(reference=reference, correlation=correlation), scalars) is expected
