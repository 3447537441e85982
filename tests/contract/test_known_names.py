"""known_names.json against the libraries it was made from."""

import importlib.metadata

import basis_set_exchange as bse
import pytest
from pyscf import dft, gto
from pyscf.data import elements
from scission.campaign.names import (
    ELEMENTS,
    basis_on,
    core_orbitals,
    is_basis,
    is_functional,
    known,
)

SAMPLE = [
    ("cc-pVDZ", "H"), ("cc-pVDZ", "O"), ("CC-PVDZ", "Cl"), ("ccpvtz", "N"), ("aug-cc-pVTZ", "F"), ("6-31G*", "C"),
    ("6-31g(d,p)", "H"), ("6-311++G(2d,2p)", "O"), ("STO-3G", "S"), ("def2-TZVP", "Ca"), ("def2-SVP", "I"),
    ("def2-tzvp", "Au"), ("LANL2DZ", "I"), ("lanl2dz", "C"), ("cc-pVDZ-PP", "Br"), ("cc-pCVDZ", "N"), ("pc-2", "Si"),
    ("cc-pV6Z", "N"), ("aug-cc-pVDZ-PP", "I"), ("cc-pVDZ", "Ca"), ("ANO-RCC-VDZP", "Fe"), ("jun-cc-pV(T+d)Z", "S"),
    ("cc-pV(D+d)Z", "Cl"), ("Sapporo-DZP-2012", "Kr"), ("ccecp-cc-pvdz", "C"), ("ccecp-cc-pvdz", "H"),
    ("bfd-vdz", "Si"), ("stuttgart", "Br"), ("def2-SV(P)", "Ag"), ("dz", "O"), ("SBKJC", "P"), ("ma-def2-SVP", "O"),
    ("x2c-SVPall", "Br"), ("midi!", "C"), ("cc-pVTZ-F12", "O"), ("ano", "N"), ("Wachters+f", "Ni"),
]  # fmt: skip


def _engine(basis: str, symbol: str) -> gto.Mole:
    entry = basis_on(basis, symbol)
    assert entry is not None, f"{basis} is not known for {symbol}"
    ecp = {} if entry.ecp is None else {symbol: entry.ecp}
    charge = (ELEMENTS[symbol] - entry.ecp_core) % 2
    return gto.M(
        atom=[[symbol, (0, 0, 0)]], basis={symbol: basis}, ecp=ecp, charge=charge, unit="bohr", verbose=0
    )


@pytest.mark.parametrize(("basis", "symbol"), SAMPLE)
def test_sizes_are_those_of_the_engine(basis: str, symbol: str) -> None:
    """Spherical functions and ECP electrons are what PySCF finds when it is given the same names."""
    entry = basis_on(basis, symbol)
    assert entry is not None
    engine = _engine(basis, symbol)

    assert (entry.functions, entry.ecp_core) == (engine.nao, engine.atom_nelec_core(0))


@pytest.mark.parametrize(
    ("basis", "symbol"), [("def2-SVP", "I"), ("LANL2DZ", "Cl"), ("cc-pVDZ", "S"), ("STO-3G", "Li")]
)
def test_frozen_cores_are_those_of_the_engine(basis: str, symbol: str) -> None:
    """Usual cores, less what the ECP stands for, agree with PySCF's own count."""
    entry = basis_on(basis, symbol)
    assert entry is not None

    assert core_orbitals(symbol, entry.ecp_core) == elements.chemcore(_engine(basis, symbol))


def test_sets_without_their_ecp_are_refused() -> None:
    """Valence-only sets stand with the core electrons their ECP replaces, or are not known at all."""
    zinc, carbon = basis_on("ccecp-cc-pvdz", "Zn"), basis_on("ccecp-cc-pvdz", "C")

    assert carbon is not None
    assert carbon.ecp_core == 2
    assert zinc is None or zinc.ecp_core == 10


@pytest.mark.parametrize(
    "name", ["cc-pVDZ-JKFIT", "def2-universal-jfit", "weigend", "gth-dzvp", "unknown", "H 0 S"]
)
def test_what_is_no_orbital_basis_is_not_known(name: str) -> None:
    """Fitting sets, sets for pseudopotentials of periodic codes, and other texts are refused."""
    assert not is_basis(name)


COMPLETE = known()["functionals"]["complete"].split()


@pytest.mark.parametrize(
    "name", [*COMPLETE[::12], "pbe", "PBE,PBE", "b3lyp", "M06-2X", "HSE06", "slater,vwn", "wb97x-d"]
)
def test_known_functionals_are_the_engines(name: str) -> None:
    """Every name is parsed by PySCF, and gives exchange and correlation terms."""
    hybrid, terms = dft.libxc.parse_xc(name)

    assert is_functional(name)
    assert terms or hybrid[0]


@pytest.mark.parametrize(
    "text",
    [
        "0.5*b88+lyp",
        "b3lyp*0.5",
        "1",
        "PBE,PBE,PBE",
        "",
        ",",
        "RSH(0.3;0.7;0.2)",
        "B3LYP-D3",
        "LDA_K_TF",
        "B88",
    ],
)
def test_expressions_are_no_functionals(text: str) -> None:
    """Sums, factors, numbers, parameters and single parts are refused."""
    assert not is_functional(text)


def test_the_file_names_the_installed_versions() -> None:
    """The table was made from the libraries of the lock file."""
    versions = {name: importlib.metadata.version(name) for name in ("pyscf", "basis-set-exchange")}

    assert known()["versions"] == versions, "run .venv/bin/python scripts/make-known-names"


def test_every_exchange_set_is_still_there() -> None:
    """Names from the Basis Set Exchange are names of the installed one."""
    gone = set(known()["bse"]) - set(bse.get_metadata())

    assert gone == set()


def test_elements_are_the_engines() -> None:
    """Symbols and atomic numbers agree with PySCF's table."""
    assert list(ELEMENTS) == elements.ELEMENTS[1:]
