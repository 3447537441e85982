"""Flags, thresholds and onsets."""

import math

import numpy as np
import pytest
from scission.thresholds import THRESHOLDS, Override, limit, resolve
from scission.verdict import FAMILIES, Context, judge, onsets

GOOD = {"t1": 0.006, "d1": 0.012, "d2": 0.12, "largest_t2": 0.05, "triplet_stability": 0.3, "luno": 0.02}


def test_all_below_is_single_reference():
    """Every diagnostic within its threshold gives single-reference and lists what was looked at."""
    flag = judge(GOOD, THRESHOLDS)

    assert flag.label == "single-reference"
    assert "T1" in flag.reasons[0]


def test_nothing_known_is_undetermined():
    """NaN and diagnostics without a threshold are no knowledge."""
    assert judge({"t1": math.nan, "homo_lumo_gap": 0.4}, THRESHOLDS).label == "undetermined"


@pytest.mark.parametrize(
    ("changes", "label"),
    [
        ({"t1": 0.03}, "borderline"),
        ({"t1": 0.05, "d1": 0.2}, "borderline"),
        ({"d2": 0.20}, "borderline"),
        ({"d2": 0.20, "largest_t2": 0.15}, "borderline"),
        ({"d2": 0.20, "triplet_stability": -0.01}, "multireference"),
        ({"luno": 0.23}, "multireference"),
        ({"triplet_stability": -0.01, "uhf_hono": 1.9, "uhf_luno": 0.15}, "borderline"),
    ],
)
def test_the_rule_counts_families_once_and_erratic_ones_half(changes, label):
    """One sign is borderline, two independent or a strong one multireference; T1 and D1 alone never."""
    assert judge(GOOD | changes, THRESHOLDS).label == label


def test_reasons_hold_the_numbers():
    """A reason reads name, value, sign, threshold."""
    assert judge({"luno": 0.13}, THRESHOLDS).reasons == ["LUNO 0.13 > 0.10"]


def test_evidence_of_another_level_counts_and_is_named():
    """A value borrowed from another level of the scan decides, and the reason says whose it is."""
    flag = judge({"t1": 0.01}, THRESHOLDS, Context(evidence={"luno": (0.31, "cas")}))

    assert flag.label == "multireference"
    assert flag.reasons == ["LUNO 0.31 > 0.20 (strong) (level cas)"]


def test_own_value_goes_before_evidence():
    """A point's own T1 is not replaced by another level's."""
    assert judge({"t1": 0.01}, THRESHOLDS, Context(evidence={"t1": (0.5, "b")})).label == "single-reference"


def test_thresholds_depend_on_the_spin():
    """T1 0.03 is over for a singlet and not for a triplet; the excess of <S^2> scales with S(S+1)."""
    assert judge({"t1": 0.03}, THRESHOLDS, Context(multiplicity=3)).label == "single-reference"
    assert limit("s2_excess", 1) == 0.1
    assert limit("s2_excess", 3) == pytest.approx(0.2)
    assert math.isnan(limit("homo_lumo_gap", 1))


def test_every_threshold_has_a_source_and_a_family():
    """No number without its source, range and provenance; strong ones lie beyond and have their own."""
    judged = {name for members in FAMILIES.values() for name in members}
    for name, kinds in THRESHOLDS.items():
        for threshold in kinds:
            assert threshold.name == name
            assert name in judged
            assert threshold.source
            assert threshold.valid_for
            assert threshold.provenance
            assert (threshold.strong is None) == (not threshold.strong_source)


def test_override_moves_the_flag_and_needs_a_source():
    """A campaign's own threshold is used with its source; without one it is refused."""
    resolved = resolve({"t1": Override(0.001, "test of this campaign")})

    assert judge({"t1": 0.006}, resolved).label == "borderline"
    with pytest.raises(ValueError, match=r"thresholds\.t1\.source.*\n.*thresholds\.t9: "):
        resolve({"t1": Override(0.03, " "), "t9": Override(1.0, "x")})


def test_onset_is_the_root_between_its_bracket():
    """A straight line through the threshold crosses it exactly where algebra says."""
    (onset,) = onsets(np.array([1.0, 2.0, 3.0]), np.array([0.0, 0.04, 0.08]), 0.05, "above")

    assert onset.onset == pytest.approx(2.25)
    assert (onset.lower, onset.upper) == (2.0, 3.0)


def test_every_crossing_is_listed_with_its_sense():
    """A diagnostic that rises over, falls back and rises again has three crossings, inside their brackets."""
    found = onsets(np.arange(6.0), np.array([0.0, 0.1, 0.3, 0.1, 0.05, 0.9]), 0.2, "above")

    assert ["falls" in onset.note for onset in found] == [False, True, False]
    assert all(onset.lower <= onset.onset <= onset.upper for onset in found)


def test_gap_widens_the_bracket_and_is_said():
    """Points without a value inside the bracket are counted in the note."""
    (onset,) = onsets(np.arange(4.0), np.array([0.0, math.nan, math.nan, 1.0]), 0.5, "above")

    assert (onset.lower, onset.upper) == (0.0, 3.0)
    assert "2 points without a value" in onset.note


@pytest.mark.parametrize(("values", "count"), [([1.0, 1.0], 0), ([5.0, 5.0], 0), ([math.nan] * 2, 0)])
def test_no_crossing_gives_no_onset(values, count):
    """Always within, exactly at the threshold, or unknown: an empty list."""
    assert len(onsets(np.arange(2.0), np.array(values), 5.0, "above")) == count


def test_over_from_the_start_has_no_place():
    """A diagnostic that starts over its threshold gives an onset before the first point, without a place."""
    (onset,) = onsets(np.arange(1.0, 4.0), np.array([-0.1, -0.2, -0.3]), 0.0, "below")

    assert math.isnan(onset.onset)
    assert onset.upper == 1.0
    assert "from the first known point" in onset.note


def test_order_of_points_does_not_matter():
    """Shuffled points give the same onset."""
    x, y = np.arange(5.0), np.arange(5.0) ** 2
    shuffled = [3, 0, 4, 1, 2]

    assert onsets(x[shuffled], y[shuffled], 3.0, "above") == onsets(x, y, 3.0, "above")
