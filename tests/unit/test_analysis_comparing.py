"""A campaign with a reference level: comparison, stretches of flags and scorecard, tables and page."""

import numpy as np
import pytest
from scission.analysis import analyse
from scission.records import Store
from scission.report.judgement import distrust, draw_scorecard, onset_table, score_table
from synthetic_campaign import TEXT, campaign, fill


@pytest.fixture(scope="module")
def frames(tmp_path_factory):
    """The made-up campaign with its active-space level as the reference."""
    folder = tmp_path_factory.mktemp("compared")
    store = Store(folder)
    return analyse(fill(store), campaign(folder, TEXT + "reference_level: cas\n"), store).frames


def quantities(frames, scan, level):
    table = frames["comparison"]
    found = table[(table.scan == scan) & (table.level == level)]
    return dict(zip(found.quantity, found["value"], strict=True))


def test_every_other_level_is_compared(frames):
    """Two scans, two levels besides the reference one, each with both ends of its trusted interval."""
    table = frames["comparison"]
    pairs = set(zip(table.scan, table.level, strict=True))

    assert pairs == {(s, lv) for s in ("h-f", "n-n") for lv in ("ccsd-t", "uhf")}
    assert set(table.reference_level) == {"cas"}
    for pair in pairs:
        found = quantities(frames, *pair)
        assert found["trusted_from"] < found["trusted_to"]
        assert found["trusted_to_lower"] <= found["trusted_to"] <= found["trusted_to_upper"]


def test_errors_are_in_the_points_and_the_npe_is_their_range(frames):
    """The column of errors holds what the comparison sums up; the reference level has none."""
    points = frames["points"]
    here = points[(points.scan == "n-n") & (points.level == "ccsd-t")].error_kcal_per_mol

    assert np.ptp(here.dropna()) == pytest.approx(quantities(frames, "n-n", "ccsd-t")["npe"])
    assert points[points.level == "cas"].error_kcal_per_mol.isna().all()


def test_stretches_of_flags_cover_every_point_once(frames):
    """The table of verdicts counts each point of each level in one stretch, with reasons."""
    table = frames["verdicts"]

    assert table.points.sum() == len(frames["points"])
    assert (table.reasons != "").all()
    assert {"single-reference", "multireference"} <= set(table.flag)


def test_the_scorecard_counts_all_points_outward_of_the_minimum(frames):
    """Hits, misses, false alarms and correct ones add up to the same points at both thresholds."""
    table = frames["scorecard"]

    assert {"d2", "luno", "t1"} <= set(table.diagnostic)
    assert "cas" not in set(table.level)
    total = table.hits + table.misses + table.false_alarms + table.correct
    assert (total > 5).all()
    known = table.dropna(subset=["best_skill"])
    assert (known.best_skill >= known.skill.fillna(-1) - 1e-12).all()


def test_the_page_shows_all_of_it(frames):
    """One row a scan and level, onsets by level, the scorecard as a table and as a picture."""
    table = distrust(frames)

    assert len(table) == 6
    assert table["multireference from / angstrom"].str.len().gt(0).all()
    assert {"scan", "diagnostic", "cas"} <= set(onset_table(frames["onsets"]))
    assert len(score_table(frames["scorecard"])) == len(frames["scorecard"])
    assert len(draw_scorecard(frames["scorecard"]).axes[0].get_yticklabels()) > 3
