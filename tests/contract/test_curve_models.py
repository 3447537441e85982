"""What every registered curve model must do, and what no curve may do to the fits."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scission.curves import MODELS, Curve, fit_curve, morse

R = np.concatenate([np.arange(1.3, 3.0, 0.12), np.arange(3.0, 9.0, 0.6)])
ENERGY = morse.energy(R, r_e=2.0, depth=0.2, a=1.0, bottom=-10.0)
EVERY = pytest.mark.parametrize("name", list(MODELS))


def curve(r, energy, usable=None):
    usable = np.ones(len(r), dtype=bool) if usable is None else usable
    return Curve(r, energy, usable, ["" if ok else "failed" for ok in usable], reduced_mass=1000.0)


def start(name):
    return MODELS[name].guess(R, ENERGY)


@EVERY
def test_guess_names_every_parameter_with_finite_values(name):
    """guess gives exactly PARAMETERS, which hold r_e, depth and bottom, the positive ones positive."""
    model = MODELS[name]
    guess = start(name)

    assert tuple(guess) == model.PARAMETERS
    assert {"r_e", "depth", "bottom"} <= set(guess)
    assert all(np.isfinite(value) for value in guess.values())
    assert all(guess[key] > 0.0 for key in model.POSITIVE)


@EVERY
def test_bottom_lies_at_r_e_and_depth_above_it(name):
    """energy(r_e) is bottom, and far out it is bottom + depth."""
    model, guess = MODELS[name], start(name)
    at_minimum, far = model.energy(np.array([guess["r_e"], 200.0]), **guess)

    assert at_minimum == pytest.approx(guess["bottom"], abs=1e-12)
    assert far == pytest.approx(guess["bottom"] + guess["depth"], abs=1e-9)


@EVERY
def test_derivatives_are_those_of_the_energy(name):
    """f2, f3 and f4 agree with a fine polynomial through the model's own energies."""
    model, guess = MODELS[name], start(name)
    x = np.linspace(-0.1, 0.1, 21)
    series = np.polynomial.Polynomial.fit(x, model.energy(guess["r_e"] + x, **guess), 9).convert().coef
    first, f2, f3, f4 = series[1], 2 * series[2], 6 * series[3], 24 * series[4]

    assert abs(first) < 1e-9
    assert model.derivatives(guess) == pytest.approx((f2, f3, f4), rel=1e-5)


@EVERY
def test_energy_keeps_the_shape_and_stays_finite(name):
    """(n,) in, (n,) out, finite from very short to very long lengths."""
    energy = MODELS[name].energy(np.linspace(0.05, 60.0, 50), **start(name))

    assert energy.shape == (50,)
    assert np.all(np.isfinite(energy))


@EVERY
def test_order_and_duplicates_do_not_matter(name):
    """Shuffled points, each given twice, lead to the same numbers."""
    order = np.random.default_rng(1).permutation(np.repeat(np.arange(R.size), 2))
    plain = fit_curve(curve(R, ENERGY), [name]).fit(name)
    shuffled = fit_curve(curve(R[order], ENERGY[order]), [name]).fit(name)

    for row in plain.rows[:6]:
        assert shuffled.value(row.quantity) == pytest.approx(row.value, rel=1e-6)


@EVERY
def test_a_shift_of_energy_changes_nothing_but_the_bottom(name):
    """A thousand hartree more leave r_e, D_e and omega_e as they are."""
    plain = fit_curve(curve(R, ENERGY), [name]).fit(name)
    shifted = fit_curve(curve(R, ENERGY - 1000.0), [name]).fit(name)

    for quantity in ("r_e", "D_e", "omega_e"):
        assert shifted.value(quantity) == pytest.approx(plain.value(quantity), rel=1e-6)


@EVERY
def test_scaled_energies_scale_depth_and_force_constant(name):
    """Energies times four: D_e and k_e times four, r_e as it was."""
    plain = fit_curve(curve(R, ENERGY), [name]).fit(name)
    scaled = fit_curve(curve(R, 4.0 * ENERGY), [name]).fit(name)

    assert scaled.value("r_e") == pytest.approx(plain.value("r_e"), rel=1e-6)
    assert scaled.value("D_e") == pytest.approx(4.0 * plain.value("D_e"), rel=1e-5)
    assert scaled.value("k_e") == pytest.approx(4.0 * plain.value("k_e"), rel=1e-5)


number = st.one_of(st.floats(-200.0, 200.0), st.sampled_from([np.nan, np.inf, -np.inf, 0.0]))
points = st.lists(st.tuples(number, number, st.booleans()), max_size=25)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(points)
def test_no_data_crash_the_fits(data):
    """Any numbers lead to a report in which every point and every model is accounted for."""
    r, energy, usable = (np.array([p[k] for p in data], dtype=float) for k in range(3))
    report = fit_curve(curve(r, energy, usable.astype(bool)))

    assert len(report.fits) == len(MODELS) + 1
    for fit in report.fits:
        assert fit.message
        assert bool(fit.rows) == fit.fitted
        assert all(np.isfinite(row.value) for row in fit.rows)
        assert [bool(why) for why in fit.why_left_out] == [not used for used in fit.used]


@settings(max_examples=40, deadline=None, derandomize=True)
@given(st.integers(0, 10_000), st.floats(1e-9, 0.3), st.integers(3, 30))
def test_noisy_wells_never_crash_the_fits(seed, scatter, size):
    """Wells with any scatter and number of points give finite numbers or words."""
    rng = np.random.default_rng(seed)
    r = np.sort(rng.uniform(1.2, 9.0, size))
    energy = morse.energy(r, 2.0, 0.2, 1.0, -10.0) + scatter * rng.standard_normal(size)

    assert all(np.isfinite(row.value) for row in fit_curve(curve(r, energy)).rows)
