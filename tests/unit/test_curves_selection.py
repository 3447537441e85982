"""Which points a fit uses, and in which words the others are left out."""

import numpy as np
import pytest
from scission.curves import LOCAL, Curve, fit_curve, morse

R = np.arange(1.4, 8.0, 0.15)
ENERGY = morse.energy(R, r_e=2.0, depth=0.22, a=1.1, bottom=-100.0)


def curve(energy=ENERGY, r=R, reasons=None):
    why = [(reasons or {}).get(i, "") for i in range(len(r))]
    return Curve(r, energy, np.array([not w for w in why]), why, reduced_mass=1800.0)


@pytest.mark.parametrize(
    ("energy", "words"),
    [
        (0.5 * np.exp(-R), "repulsive"),
        (0.01 * R, "rises outward from the shortest"),
        (np.zeros_like(R), "flat"),
        (np.full_like(R, np.nan), "no usable point"),
    ],
)
def test_curves_without_a_minimum_give_words_and_no_numbers(energy, words):
    """Repulsive, edge, flat and empty curves are not fitted, say why, and have no rows."""
    report = fit_curve(curve(energy))

    assert report.rows == ()
    assert report.preferred is None
    assert all(words in fit.message for fit in report.fits)


def test_too_few_points_are_counted():
    """Five points are too few for every model, and the message says how many are needed."""
    report = fit_curve(curve(ENERGY[2:7], R[2:7]))

    assert all(fit.status == "not fitted" for fit in report.fits)
    assert "needs 6" in report.fit("morse").message


def test_every_point_is_used_or_has_a_reason():
    """Each point of each model is either used or left out with a reason, never both."""
    reasons = {3: "failed: no convergence", 25: "flagged multireference"}
    for fit in fit_curve(curve(reasons=reasons), window=(1.5, 6.0)).fits:
        assert [bool(why) for why in fit.why_left_out] == [not used for used in fit.used]


def test_the_window_ends_at_the_first_flagged_point():
    """Unflagged points beyond a flagged one are left out too, and the message says where it ends."""
    fit = fit_curve(curve(reasons={20: "flagged multireference"})).fit("morse")

    assert not fit.used[20:].any()
    assert fit.why_left_out[21] == "beyond the first flagged point"
    assert "the window ends at 2.249 angstrom" in fit.message


def test_one_missing_point_is_bridged_and_two_are_not():
    """A lone failure costs one point; two in a row end the window."""
    alone = fit_curve(curve(reasons={20: "failed"})).fit("morse")
    two = fit_curve(curve(reasons={20: "failed", 21: "failed"})).fit("morse")

    assert alone.used.sum() == R.size - 1
    assert not two.used[20:].any()


def test_a_level_that_breaks_down_is_fitted_up_to_its_hump():
    """Where the energy falls again outward the window ends at the top."""
    broken = ENERGY - np.where(R > 4.0, 0.05 * (R - 4.0), 0.0)
    fit = fit_curve(curve(broken)).fit("morse")

    assert R[fit.used].max() < 4.2
    assert "energy falls again" in fit.message


def test_flags_at_the_minimum_give_numbers_with_a_caution():
    """A level doubted at its own minimum is fitted near it, with a caution and a count, not in silence."""
    report = fit_curve(curve(reasons=dict.fromkeys(range(3, R.size), "flagged multireference")))
    fit = report.fit(LOCAL)

    assert fit.fitted
    assert "caution" in fit.message
    assert fit.value("flagged_points_used") > 0
    assert R[fit.used].max() <= 1.4 * R[4]


def test_failed_points_are_never_admitted():
    """Points that failed stay out even where nothing is left without them."""
    report = fit_curve(curve(reasons=dict.fromkeys(range(3, R.size), "failed: time limit")))

    assert report.rows == ()


def test_the_inner_wall_above_dissociation_is_left_out():
    """Points inside the minimum that lie above the far end do not pull the fit."""
    r = np.append([0.9, 1.0], R)
    fit = fit_curve(curve(morse.energy(r, 2.0, 0.22, 1.1, -100.0), r)).fit("morse")

    assert fit.why_left_out[0] == "on the inner wall, above the far end of the well"
