"""Levels against a reference level, and diagnostics against the errors of levels."""

import numpy as np
import pytest
from scission.verdict import compare, score

X = np.linspace(0.8, 3.0, 23)
REFERENCE = (1.0 - np.exp(-2.0 * (X - 1.1))) ** 2


def test_a_constant_error_is_no_error():
    """A level that is parallel to the reference is trusted everywhere, at both ends of the scan."""
    found = compare(X, REFERENCE + 0.3, REFERENCE, 1e-3)

    assert (found.npe, found.largest, found.mean_absolute) == pytest.approx((0.0, 0.0, 0.0), abs=1e-12)
    assert found.outer.open
    assert found.outer.place == X[-1]
    assert found.inner.place == X[0]


def test_edges_lie_where_algebra_says():
    """An error of 0.1 (r - 1.1) leaves 0.05 at 1.6 outward; inward the scan ends first."""
    found = compare(X, REFERENCE + 0.1 * (X - 1.1), REFERENCE, 0.05)

    assert found.minimum == pytest.approx(1.1, abs=2e-3)
    assert found.outer.place == pytest.approx(1.6, abs=3e-3)
    assert found.outer.lower <= found.outer.place <= found.outer.upper
    assert found.npe == pytest.approx(0.22)
    assert found.largest == pytest.approx(0.19, abs=2e-4)
    assert found.largest_at == 3.0


def test_trust_ends_before_a_missing_point():
    """What failed is not trusted, on whichever of the two levels it failed, and the note says so."""
    energy = REFERENCE + 0.2
    energy[12] = np.nan
    found = compare(X, energy, REFERENCE, 1e-3)

    assert found.outer.open
    assert (found.outer.place, found.outer.upper) == (pytest.approx(X[11]), pytest.approx(X[12]))
    assert "no result" in found.outer.note
    assert np.isnan(found.error[12])


@pytest.mark.parametrize("reference", [np.full(23, np.nan), X, -X])
def test_a_reference_without_a_minimum_says_so(reference):
    """No zero, no comparison: the reason is given in words."""
    found = compare(X, REFERENCE, reference, 1e-3)

    assert "minimum" in found.problem
    assert found.outer is None


def test_counts_and_best_threshold_of_a_separable_case():
    """Errors exactly above 0.3: the published 0.2 raises false alarms, the best threshold none."""
    values = np.array([0.05, 0.1, 0.22, 0.25, 0.35, 0.5])
    found = score(values, values > 0.3, 0.2, "above")

    assert found.at_threshold.__dict__ == {"hits": 2, "misses": 0, "false_alarms": 2, "correct": 2}
    assert found.best == pytest.approx(0.3)
    assert found.at_best.skill == 1.0


def test_direction_and_hopeless_cases():
    """Below works like above mirrored; without both kinds of points there is no best threshold."""
    values = np.array([0.95, 0.9, 0.7, 0.5])

    assert score(values, values < 0.8, 0.9, "below").best == pytest.approx(0.8)
    assert np.isnan(score(values, values < 2.0, 0.9, "below").best)
    assert np.isnan(score(values, values < 2.0, 0.9, "below").at_threshold.skill)
