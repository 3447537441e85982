"""The pictures of H2 against closed forms over Slater 1s functions and published constants.

Basis: UGBS, many s functions, whose free-atom orbital is the exact 1s (zeta = 1) to 3e-8 hartree.
"""

import numpy as np
import pytest
from scipy.optimize import minimize_scalar
from scipy.special import expi
from scission.chemistry.pictures import solve_picture
from scission.units import HARTREE_IN_EV

SLATER_LIKE = "ugbs"


def picture(reference, r, symbols=("H", "H"), charge=0, basis=SLATER_LIKE):
    facts = {"symbols": list(symbols), "charge": charge, "multiplicity": 1}
    spec = {"reference": reference, "basis": dict.fromkeys(symbols, basis)}
    positions = [[0.0, 0.0, 0.0], [0.0, 0.0, r]]
    return solve_picture({"molecule": facts, "spec": spec, "positions": positions, "fragments": [[0], [1]]})


def integrals(w):
    """Closed forms for zeta = 1 at distance ``w``: overlap, h_aa, h_ab, (aa|aa), (aa|bb), (aa|ab), (ab|ab).

    Sugiura, Z. Phys. 45, 484 (1927), and Slater's textbooks (from memory).
    """
    s = np.exp(-w) * (1 + w + w**2 / 3)
    s_prime = np.exp(w) * (1 - w + w**2 / 3)
    j = -1 / w + np.exp(-2 * w) * (1 + 1 / w)
    k = -np.exp(-w) * (1 + w)
    aabb = 1 / w - np.exp(-2 * w) * (1 / w + 11 / 8 + 3 * w / 4 + w**2 / 6)
    aaab = np.exp(-w) * (w + 1 / 8 + 5 / (16 * w)) - np.exp(-3 * w) * (1 / 8 + 5 / (16 * w))
    logs = s**2 * (np.euler_gamma + np.log(w)) + s_prime**2 * expi(-4 * w) - 2 * s * s_prime * expi(-2 * w)
    abab = 0.2 * (-np.exp(-2 * w) * (-25 / 8 + 23 * w / 4 + 3 * w**2 + w**3 / 3) + 6 / w * logs)
    return s, 0.5 + (-1 + j), -s / 2 - k + 2 * k, 5 / 8, aabb, aaab, abab


def closed_form(reference, w):
    """Energy of a picture of H2, hartree, from the closed forms."""
    s, haa, hab, aaaa, aabb, aaab, abab = integrals(w)
    covalent = 2 * haa + 2 * s * hab + aabb + abab
    ionic = 2 * haa + 2 * s * hab + aaaa + abab
    mixed = 2 * hab + 2 * s * haa + 2 * aaab
    if reference == "PAIR":
        electronic = covalent / (1 + s**2)
    elif reference == "ORBITAL":
        electronic = (covalent + ionic + 2 * mixed) / (2 * (1 + s) ** 2)
    else:
        h, m = np.array([[covalent, mixed], [mixed, ionic]]), np.array([[1 + s**2, 2 * s], [2 * s, 1 + s**2]])
        electronic = np.linalg.eigvals(np.linalg.solve(m, h)).real.min()
    return electronic + 1 / w


@pytest.mark.parametrize("r", [0.8, 1.4, 1.64, 2.5, 4.0, 8.0])
@pytest.mark.parametrize("reference", ["PAIR", "ORBITAL", "PAIR+IONIC"])
def test_pictures_of_h2_follow_their_closed_forms(reference, r):
    """Within 2e-6 hartree, at short, equilibrium and long distances."""
    assert picture(reference, r).energy == pytest.approx(closed_form(reference, r), abs=2e-6)


# Closed-form D_e (eV) and R_e (bohr) with zeta = 1, as tabulated in textbooks; the values of the pair
# function correct Heitler and London, Z. Phys. 44, 455 (1927), by Sugiura's integral.
PUBLISHED = [("PAIR", 3.156, 5e-4, 1.64), ("ORBITAL", 2.70, 5e-3, 1.60), ("PAIR+IONIC", 3.23, 5e-3, 1.67)]


@pytest.mark.parametrize(("reference", "depth", "digits", "length"), PUBLISHED)
def test_pictures_of_h2_have_the_published_depth_and_length(reference, depth, digits, length):
    """To the last digit that is printed."""
    bottom = minimize_scalar(
        lambda r: picture(reference, r).energy, bounds=(1.3, 2.0), method="bounded", options={"xatol": 1e-3}
    )

    assert (-1.0 - bottom.fun) * HARTREE_IN_EV == pytest.approx(depth, abs=digits)
    assert bottom.x == pytest.approx(length, abs=5e-3)


@pytest.mark.parametrize("reference", ["PAIR", "PAIR+IONIC"])
def test_pair_functions_go_to_two_atoms(reference):
    """Far apart the energy is that of two hydrogen atoms, -1 hartree."""
    assert picture(reference, 40.0).energy == pytest.approx(-1.0, abs=1e-6)


def test_the_orbital_picture_goes_to_half_ionic():
    """-1 + (aa|aa)/2 - 1/(2R): half of it is H+ and H-, which attract each other; (aa|aa) = 5/8."""
    r = 40.0

    assert picture("ORBITAL", r).energy == pytest.approx(-1.0 + 5 / 16 - 1 / (2 * r), abs=1e-6)


def test_the_orbital_picture_is_half_covalent_at_any_length():
    """a + b doubly occupied holds ab + ba, aa and bb as 2 : 1 : 1, whatever the overlap."""
    for r in (0.8, 1.6, 30.0):
        numbers = picture("ORBITAL", r).numbers

        assert numbers["vb_covalent"] == pytest.approx(0.5, abs=1e-6)
        assert numbers["vb_captured"] == pytest.approx(1.0, abs=1e-9)


def test_pair_function_of_unlike_atoms_goes_to_them():
    """HeH+ goes to H and He+, -1/2 and -2 hartree: at frozen shape the ion attracts the atom no more."""
    solution = picture("PAIR", 40.0, ("He", "H"), 1)

    assert solution.energy == pytest.approx(-2.5, abs=1e-4)
