"""Flags, thresholds and onsets."""

import math

import numpy as np
import pytest
from scission.thresholds import THRESHOLDS, Override, limit, resolve, threshold_for
from scission.thresholds.rule import RULE, changed
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
        ({"t1": 0.03}, "single-reference"),
        ({"t1": 0.05, "d1": 0.2}, "single-reference"),
        ({"d2": 0.20}, "single-reference"),
        ({"d2": 0.31, "largest_t2": 0.21}, "borderline"),
        ({"d2": 0.20, "triplet_stability": -0.01}, "single-reference"),
        ({"d2": 0.20, "triplet_stability": -0.05}, "borderline"),
        ({"luno": 0.23}, "borderline"),
        ({"luno": 0.23, "d2": 0.31, "triplet_stability": -0.2}, "multireference"),
    ],
)
def test_the_label_is_the_nearest_whole_mean_grade(changes, label):
    """One sign among many that are within is little; signs that agree and are strong are multireference."""
    assert judge(GOOD | changes, THRESHOLDS).label == label


def test_an_unstable_determinant_alone_is_at_most_borderline():
    """However negative: coupled cluster on an unstable determinant may still be sound."""
    flag = judge({"triplet_stability": -0.5}, THRESHOLDS)

    assert flag.label == "borderline"
    assert any("no more than borderline" in reason for reason in flag.reasons)


def test_the_mean_grade_is_the_one_of_the_documented_rule():
    """Two families: D2 half way to strong, T1 (weight 1/2) within: (1 * 1.5 + 0.5 * 0) / 1.5."""
    flag = judge({"d2": 0.24, "t1": 0.005}, THRESHOLDS)

    assert flag.grade == pytest.approx(1.0)


def test_a_family_is_counted_once():
    """HONO and LUNO mirror each other: together they say no more than one of them."""
    one = judge({"luno": 0.15, "d2": 0.1}, THRESHOLDS).grade

    assert judge({"luno": 0.15, "hono": 1.85, "d2": 0.1}, THRESHOLDS).grade == pytest.approx(one)


def test_grades_rise_straight_between_near_threshold_and_strong():
    """0 up to near, 1 at the threshold, 2 from strong on; instability raises doubt from -0.03 on."""
    luno, stability = THRESHOLDS["luno"][0], THRESHOLDS["triplet_stability"][0]

    assert [luno.grade(x, 1) for x in (0.05, 0.08, 0.09, 0.1, 0.15, 0.2, 0.9)] == pytest.approx(
        [0, 0, 0.5, 1, 1.5, 2, 2]
    )
    assert [stability.grade(x, 1) for x in (0.2, 0.0, -0.03, -0.065, -0.3)] == pytest.approx(
        [0, 0, 1, 1.5, 2]
    )


def test_reasons_hold_the_numbers_and_the_level():
    """A reason reads name, value, sign, threshold, level; near ones say that they are near."""
    flag = judge({"luno": 0.13, "d2": 0.17}, THRESHOLDS, Context(level="cas"))

    assert flag.reasons[:2] == ["LUNO 0.13 > 0.10 (level cas)", "D2 0.17 near 0.18 (level cas)"]


def test_evidence_of_another_level_counts_and_is_named():
    """A value borrowed from another level of the scan decides, and the reason says whose it is."""
    flag = judge({"t1": 0.05}, THRESHOLDS, Context(evidence={"luno": (0.31, "cas")}, level="cc"))

    assert flag.label == "multireference"
    assert flag.reasons[0] == "LUNO 0.31 > 0.10 (strong, level cas)"


def test_little_knowledge_is_undetermined():
    """T1 alone weighs too little to call a point single-reference or not."""
    assert judge({"t1": 0.005}, THRESHOLDS).label == "undetermined"


def test_weights_and_limits_can_be_changed():
    """A diagnostic without weight is left out; other limits move the label, not the grade."""
    values = GOOD | {"d2": 0.31}
    quiet = changed(RULE, {"d2": 0.0, "largest_t2": 0.0}, None, "test")
    strict = changed(RULE, {}, (0.1, 0.3), "test")

    assert judge(values, THRESHOLDS, rule=quiet).label == "single-reference"
    assert judge(values, THRESHOLDS, rule=strict).label == "multireference"
    with pytest.raises(ValueError, match="in no family"):
        changed(RULE, {"dipole": 1.0}, None, "test")


def test_own_value_goes_before_evidence():
    """A point's own T1 is not replaced by another level's."""
    values = {"t1": 0.01, "d2": 0.1}

    assert judge(values, THRESHOLDS, Context(evidence={"t1": (0.5, "b")})).label == "single-reference"


def test_thresholds_depend_on_the_spin():
    """T1 0.03 is over for a singlet and not for a triplet; the excess of <S^2> scales with S(S+1)."""
    assert THRESHOLDS["t1"][0].grade(0.03, 1) > 1.0
    assert threshold_for("t1", 3).grade(0.03, 3) == 0.0
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

    values = {"t1": 0.006, "d2": 0.1}

    assert judge(values, resolved).grade > judge(values, THRESHOLDS).grade
    with pytest.raises(ValueError, match=r"thresholds\.t1\.source.*\n.*thresholds\.n_u\.direction: "):
        resolve({"t1": Override(0.03, " "), "n_u": Override(1.0, "x")})


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


def test_a_kink_is_where_the_interpolation_begins():
    """An unrestricted determinant leaves its resting value with a slope: the crossing lies beyond it.

    Occupation 1 - sqrt(1 - d), d = 1.5 (x - 1.2) beyond 1.2, reaches 0.1 at 1.2 + 0.19 / 1.5 in closed form.
    """
    x = np.linspace(0.8, 1.8, 11)
    broken = np.clip(1.5 * (x - 1.2), 0.0, 0.999)
    (onset,) = onsets(x, 1.0 - np.sqrt(1.0 - broken), 0.1, "above")
    (known,) = onsets(x, 1.0 - np.sqrt(1.0 - broken), 0.1, "above", break_at=1.2)

    assert onset.onset == pytest.approx(1.2 + 0.19 / 1.5, abs=0.01)
    assert known.onset == pytest.approx(1.2 + 0.19 / 1.5, abs=0.002)


def test_order_of_points_does_not_matter():
    """Shuffled points give the same onset."""
    x, y = np.arange(5.0), np.arange(5.0) ** 2
    shuffled = [3, 0, 4, 1, 2]

    assert onsets(x[shuffled], y[shuffled], 3.0, "above") == onsets(x, y, 3.0, "above")
