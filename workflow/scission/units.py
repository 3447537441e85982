"""Conversion factors and masses: the only place where a unit is turned into another.

All factors are built from one CODATA set, the one that ``scipy.constants`` carries.
Inside the library lengths are in bohr, energies in hartree, masses in electron masses.
"""

from scipy import constants as _c

CODATA = "CODATA as shipped with scipy.constants"

BOHR_IN_ANGSTROM: float = _c.physical_constants["Bohr radius"][0] * 1e10
ANGSTROM_IN_BOHR: float = 1.0 / BOHR_IN_ANGSTROM
HARTREE_IN_EV: float = _c.physical_constants["Hartree energy in eV"][0]
HARTREE_IN_JOULE: float = _c.physical_constants["Hartree energy"][0]
HARTREE_IN_PER_CM: float = _c.physical_constants["hartree-inverse meter relationship"][0] / 100.0
HARTREE_IN_KCAL_PER_MOL: float = HARTREE_IN_JOULE * _c.N_A / (1000.0 * _c.calorie)
HARTREE_PER_BOHR2_IN_NEWTON_PER_METRE: float = HARTREE_IN_JOULE / (_c.physical_constants["Bohr radius"][0] ** 2)
DALTON_IN_ELECTRON_MASS: float = (
    _c.physical_constants["atomic mass constant"][0] / _c.physical_constants["electron mass"][0]
)
AU_DIPOLE_IN_DEBYE: float = (
    _c.physical_constants["atomic unit of electric dipole mom."][0] * _c.c * 1e21
)
