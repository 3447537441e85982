"""Conversion factors: the only place where a unit is turned into another.

All factors are built from one CODATA set, written out here because every command of the program needs them
at once and ``scipy.constants``, which the tests compare them with, takes half a second to load.
Inside the library lengths are in bohr, energies in hartree, masses in electron masses.
"""

CODATA = "CODATA 2022 (P. J. Mohr, D. B. Newell, B. N. Taylor and E. Tiesinga, 2024)"

BOHR_IN_METRE: float = 5.29177210544e-11
HARTREE_IN_JOULE: float = 4.3597447222060e-18
HARTREE_IN_EV: float = 27.211386245981
HARTREE_IN_PER_CM: float = 219474.63136314
ELECTRON_MASS_IN_KG: float = 9.1093837139e-31
DALTON_IN_KG: float = 1.66053906892e-27
BOLTZMANN_IN_JOULE_PER_KELVIN: float = 1.380649e-23
AVOGADRO_PER_MOL: float = 6.02214076e23
SPEED_OF_LIGHT_IN_METRE_PER_S: float = 299792458.0
CALORIE_IN_JOULE: float = 4.184
AU_DIPOLE_IN_COULOMB_METRE: float = 8.4783536198e-30

BOHR_IN_ANGSTROM: float = BOHR_IN_METRE * 1e10
ANGSTROM_IN_BOHR: float = 1.0 / BOHR_IN_ANGSTROM
HARTREE_IN_KCAL_PER_MOL: float = HARTREE_IN_JOULE * AVOGADRO_PER_MOL / (1000.0 * CALORIE_IN_JOULE)
HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE: float = HARTREE_IN_JOULE / BOHR_IN_METRE**2
DALTON_IN_ELECTRON_MASS: float = DALTON_IN_KG / ELECTRON_MASS_IN_KG
AU_DIPOLE_IN_DEBYE: float = AU_DIPOLE_IN_COULOMB_METRE * SPEED_OF_LIGHT_IN_METRE_PER_S * 1e21
KELVIN_IN_HARTREE: float = BOLTZMANN_IN_JOULE_PER_KELVIN / HARTREE_IN_JOULE
