"""Fits of curves whose answer is known in closed form."""

import numpy as np
import pytest
from scission.curves import LOCAL, Curve, fit_curve, model_energy, morse
from scission.curves.extended_rydberg import energy as rydberg_energy
from scission.curves.global_fit import weights
from scission.units import BOHR_IN_ANGSTROM, HARTREE_IN_EV, HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE

TRUTH = {"r_e": 2.0, "depth": 0.22, "a": 1.1, "bottom": -100.0}
GRID = np.concatenate([np.arange(1.4, 3.0, 0.1), np.arange(3.0, 8.0, 0.4), [10.0, 14.0, 19.0]])
MASS = 1800.0


def curve(r, energy, **options):
    r = np.asarray(r, dtype=float)
    options = {"reduced_mass": MASS} | options
    return Curve(r, energy, np.ones(r.size, dtype=bool), [""] * r.size, **options)


def morse_curve(r=GRID, **options):
    return curve(r, morse.energy(np.asarray(r), **TRUTH), **options)


def test_morse_parameters_come_back_from_their_own_curve():
    """A noise-free Morse curve gives back r_e, D_e and k_e = 2 D a^2 to ten digits."""
    fit = fit_curve(morse_curve()).fit("morse")

    assert fit.value("r_e") == pytest.approx(2.0 * BOHR_IN_ANGSTROM, rel=1e-10)
    assert fit.value("D_e") == pytest.approx(0.22 * HARTREE_IN_EV, rel=1e-10)
    k_e = 2 * 0.22 * 1.1**2 * HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE
    assert fit.value("k_e") == pytest.approx(k_e, rel=1e-10)


def test_extended_rydberg_parameters_come_back_from_their_own_curve():
    """A noise-free extended Rydberg curve gives back all six parameters."""
    truth = {"r_e": 2.1, "depth": 0.3, "a1": 2.4, "a2": 1.1, "a3": 0.5, "bottom": -75.0}
    fit = fit_curve(curve(GRID, rydberg_energy(GRID, **truth))).fit("extended-rydberg")

    assert fit.parameters == pytest.approx(truth, rel=1e-6)


def test_the_model_that_made_the_curve_is_preferred():
    """AICc marks Morse on a Morse curve and extended Rydberg on an extended Rydberg curve."""
    rydberg = rydberg_energy(GRID, 2.1, 0.3, 2.4, 1.1, 0.5, -75.0)

    assert fit_curve(morse_curve()).preferred == "morse"
    assert fit_curve(curve(GRID, rydberg)).preferred == "extended-rydberg"


def test_the_choice_names_its_criterion():
    """The reason says AICc and how far the other model lies from it."""
    reason = fit_curve(morse_curve()).reason

    assert "AICc" in reason
    assert "extended-rydberg +" in reason


def test_standard_errors_cover_the_truth():
    """On noisy curves the truth lies within two standard errors about 95 times of 100 (here: 85 and more)."""
    exact = fit_curve(morse_curve(), ["morse"]).fit("morse")
    rng = np.random.default_rng(7)
    names = ("r_e", "D_e", "omega_e", "alpha_e")
    inside = dict.fromkeys(names, 0)
    for _ in range(60):
        noisy = morse.energy(GRID, **TRUTH) + noise(rng)
        fit = fit_curve(curve(GRID, noisy), ["morse"]).fit("morse")
        for name in names:
            inside[name] += abs(fit.value(name) - exact.value(name)) < 2.0 * fit.stderr(name)

    assert min(inside.values()) >= 0.85 * 60


def noise(rng):
    """Scatter that grows away from the minimum, as the weights of the fit assume."""
    return 1e-5 * rng.standard_normal(GRID.size) / weights(morse.energy(GRID, **TRUTH))


@pytest.mark.parametrize("scatter", [0.0, 1e-7, 1e-5])
def test_local_polynomial_errors_cover_the_truth(scatter):
    """With and without noise the local constants lie within two of their errors in most cases."""
    exact = fit_curve(morse_curve(), ["morse"]).fit("morse")
    rng = np.random.default_rng(3)
    names = ("r_e", "omega_e", "omega_e_x_e", "alpha_e")
    inside = []
    for shift in np.linspace(0.0, 0.09, 12):
        r = GRID + shift
        energy = morse.energy(r, **TRUTH) + scatter * rng.standard_normal(r.size)
        fit = fit_curve(curve(r, energy), []).fit(LOCAL)
        inside += [abs(fit.value(name) - exact.value(name)) < 2.0 * fit.stderr(name) for name in names]

    assert np.mean(inside) > 0.85


def test_harmonic_curve_has_no_anharmonicity():
    """On a parabola k_e is its curvature, omega_e x_e zero, and alpha_e = -6 B_e^2/omega_e (Dunham, a1 = 0).

    Each within its stated error, and the error of k_e below a part in a hundred thousand.
    """
    r = np.linspace(1.8, 2.2, 15)
    fit = fit_curve(curve(r, 0.25 * (r - 2.0) ** 2 - 40.0), []).fit(LOCAL)
    rotation = -6 * fit.value("B_e") ** 2 / fit.value("omega_e")

    k_e = 0.5 * HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE
    assert fit.stderr("k_e") < 1e-5 * k_e
    for quantity, truth in {"k_e": k_e, "omega_e_x_e": 0.0, "alpha_e": rotation}.items():
        assert abs(fit.value(quantity) - truth) < 2.0 * fit.stderr(quantity)


def test_extrapolated_depth_is_said_and_its_error_holds_what_no_point_saw():
    """A scan that ends at 93 % of D_e says so, and the missing 7 % are part of the error."""
    fit = fit_curve(morse_curve(np.linspace(1.5, 5.0, 20))).fit("morse")

    assert "extrapolated" in fit.message
    assert fit.value("D_e_coverage") == pytest.approx((1 - np.exp(-1.1 * 3.0)) ** 2, abs=1e-6)
    missing = (1 - fit.value("D_e_coverage")) * fit.value("D_e")
    assert fit.stderr("D_e") == pytest.approx(missing, rel=1e-6)


def test_a_depth_with_a_large_error_is_withheld_in_words():
    """At 84 % of D_e its error would be 16 %, more than the tenth that is allowed."""
    fit = fit_curve(morse_curve(np.linspace(1.5, 4.25, 20))).fit("morse")

    assert np.isnan(fit.value("D_e"))
    assert "no D_e: its standard error would be 16% of it" in fit.message


def test_a_scan_that_ends_low_in_the_well_has_no_depth():
    """Points up to a quarter of the depth give no D_e, with words instead."""
    fit = fit_curve(morse_curve(np.linspace(1.6, 2.6, 12))).fit("morse")

    assert fit.fitted
    assert np.isnan(fit.value("D_e"))
    assert "no D_e" in fit.message


def test_fragment_energies_give_the_depth_of_a_short_scan():
    """With the fragments' energies known the local polynomial has D_e without any far point."""
    short = morse_curve(np.linspace(1.6, 2.6, 12), fragment_limit=-99.78)

    assert fit_curve(short).fit(LOCAL).value("D_e") == pytest.approx(0.22 * HARTREE_IN_EV, rel=1e-6)


def test_polyatomic_stretch_has_no_rotational_constants():
    """A stretch of a polyatomic gives omega_stretch and the mass it used, no omega_e, B_e or alpha_e."""
    names = {row.quantity for row in fit_curve(morse_curve(diatomic=False)).rows}

    assert {"r_e", "k_e", "D_e", "omega_stretch", "reduced_mass"} <= names
    assert not names & {"omega_e", "omega_e_x_e", "B_e", "alpha_e"}


def test_without_a_mass_only_the_well_is_reported():
    """No reduced mass, no wavenumbers."""
    names = {row.quantity for row in fit_curve(morse_curve(reduced_mass=None)).rows}

    assert not names & {"omega_e", "omega_stretch", "B_e", "reduced_mass"}


def test_plotted_model_is_the_fitted_one():
    """model_energy of every fit reproduces energy minus residual at the points it used."""
    data = morse_curve()
    for fit in fit_curve(data).fits:
        shown = model_energy(fit, data.r[fit.used])

        assert shown == pytest.approx(data.energy[fit.used] - fit.residual[fit.used], abs=1e-11)


def test_unknown_model_is_an_error_with_the_list():
    """A model that is not in the registry is named, with the ones there are."""
    with pytest.raises(ValueError, match=r"'mors'.*morse, extended-rydberg"):
        fit_curve(morse_curve(), ["mors"])


def test_lengths_of_arrays_must_agree():
    """A curve whose arrays differ in length is refused."""
    with pytest.raises(ValueError, match="one entry per point"):
        Curve(np.arange(3.0), np.arange(2.0), np.ones(3, dtype=bool), [""] * 3)
