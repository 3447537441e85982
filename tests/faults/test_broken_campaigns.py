"""Broken campaign files: each problem is found, with its path, its value and the rule."""

import time
from pathlib import Path
from typing import Any

import pytest
import yaml
from campaigns import DELETE, GOOD, changed, load, load_text
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scission.campaign import Campaign, CampaignError, load_campaign
from scission.campaign.problems import MISSING

WATER, CC, CAS, DFT, OH, HH = (
    "molecules/water", "levels/cc", "levels/cas", "levels/dft", "scans/one-oh", "scans/hh",
)  # fmt: skip
ATOMS = f"{WATER}/atoms"
LENGTHS = f"{OH}/stretch/lengths"
H_ON_H = "H 0 0 0\nH 0 0 0.05"
TRIPLET_O = {"charge": 0, "multiplicity": 3, "atoms": "O 0 0 0\nO 0 0 1.2"}
OXYGEN_SCAN = {"molecule": "oxygen", "levels": ["cas"], "stretch": {"bond": ["O1", "O2"], "lengths": [1.2]}}
XENON = {"charge": 0, "multiplicity": 1, "atoms": "Xe 0 0 0\nH 0 0 1.7\nH 0 0 -1.7"}
XENON_SCAN = {"molecule": "xenon", "levels": ["cc"], "stretch": {"bond": ["Xe1", "H2"], "lengths": [1.7]}}
RING = {"molecule": "cyclopropane", "levels": ["cc"], "stretch": {"bond": ["C1", "C2"], "lengths": [1.5]}}

# The table is easier to read with one entry a line: long lines are allowed in it.
# ruff: noqa: E501
# edits, path of the problem, its value, part of its rule
BROKEN: list[tuple[list[tuple[str, Any]], str, Any, str]] = [
    # unknown keys
    ([("title", "x")], "title", "title", "is not a key here (campaign, molecules,"),
    ([(f"{WATER}/spin", 0)], "molecules.water.spin", "spin", "is not a key here (charge, multiplicity"),
    ([(f"{CC}/method", "x")], "levels.cc.method", "method", "is not a key here (reference, functional"),
    ([(f"{OH}/bond", 1)], "scans.one-oh.bond", "bond", "is not a key here (molecule, levels, stretch)"),
    ([(f"{OH}/stretch/atoms", 1)], "scans.one-oh.stretch.atoms", "atoms", "is not a key here (bond, lengths, move)"),
    ([(f"{LENGTHS}/step", 1)], "scans.one-oh.stretch.lengths.step", "step", "(from, to, points, spacing)"),
    ([(f"{CAS}/active_space/core", 1)], "levels.cas.active_space.core", "core", "(electrons, orbitals, atomic"),
    ([("diagnostics/cutoffs", {})], "diagnostics.cutoffs", "cutoffs", "is not a key here (thresholds, weights, limits, include)"),
    ([("fit/order", 2)], "fit.order", "order", "is not a key here (models)"),
    # missing keys
    ([("campaign", DELETE)], "campaign", MISSING, "is missing"),
    ([("molecules", DELETE)], "molecules", MISSING, "is missing"),
    ([("levels", DELETE)], "levels", MISSING, "is missing"),
    ([("scans", DELETE)], "scans", MISSING, "is missing"),
    ([(f"{WATER}/charge", DELETE)], "molecules.water.charge", MISSING, "is missing"),
    ([(f"{WATER}/multiplicity", DELETE)], "molecules.water.multiplicity", MISSING, "is missing"),
    ([(f"{WATER}/atoms", DELETE)], "molecules.water", MISSING, "give atoms or xyz"),
    ([(f"{CC}/reference", DELETE)], "levels.cc.reference", MISSING, "is missing"),
    ([(f"{CC}/basis", DELETE)], "levels.cc.basis", MISSING, "is missing"),
    ([(f"{OH}/molecule", DELETE)], "scans.one-oh.molecule", MISSING, "is missing"),
    ([(f"{OH}/levels", DELETE)], "scans.one-oh.levels", MISSING, "is missing"),
    ([(f"{OH}/stretch", DELETE)], "scans.one-oh", MISSING, "needs exactly one coordinate (stretch)"),
    ([(f"{OH}/stretch/bond", DELETE)], "scans.one-oh.stretch.bond", MISSING, "is missing"),
    ([(f"{OH}/stretch/lengths", DELETE)], "scans.one-oh.stretch.lengths", MISSING, "is missing"),
    ([(f"{LENGTHS}/from", DELETE)], "scans.one-oh.stretch.lengths.from", MISSING, "is missing"),
    ([(f"{LENGTHS}/points", DELETE)], "scans.one-oh.stretch.lengths.points", MISSING, "is missing"),
    ([(f"{CAS}/active_space/orbitals", DELETE)], "levels.cas.active_space.orbitals", MISSING, "is missing"),
    # wrong types
    ([("campaign", 2024)], "campaign", 2024, "must be a text"),
    ([("molecules", ["water"])], "molecules", ["water"], "must be a mapping"),
    ([("scans", None)], "scans", None, "must be a mapping"),
    ([("scans", {})], "scans", {}, "is empty"),
    ([(WATER, "H2O")], "molecules.water", "H2O", "must be a mapping"),
    ([(f"{WATER}/charge", "0")], "molecules.water.charge", "0", "must be a whole number"),
    ([(f"{WATER}/charge", 0.5)], "molecules.water.charge", 0.5, "must be a whole number"),
    ([(f"{WATER}/charge", True)], "molecules.water.charge", True, "must be a whole number"),
    ([(f"{WATER}/multiplicity", "singlet")], "molecules.water.multiplicity", "singlet", "must be a whole number"),
    ([(ATOMS, ["O", "H", "H"])], "molecules.water.atoms", ["O", "H", "H"], "must be a text"),
    ([(f"{WATER}/unit", "nm")], "molecules.water.unit", "nm", "must be one of 'angstrom', 'bohr'"),
    ([(f"{CC}/frozen_core", "some")], "levels.cc.frozen_core", "some", "must be true or false"),
    ([(f"{CC}/basis", 6)], "levels.cc.basis", 6, "must be the name of a basis, or a mapping"),
    ([(f"{CC}/basis", {})], "levels.cc.basis", {}, "is empty"),
    ([(f"{CC}/basis", {"H": 1})], "levels.cc.basis.H", 1, "must be a text"),
    ([(f"{CAS}/active_space", 2)], "levels.cas.active_space", 2, "must be auto or {electrons"),
    ([(f"{CAS}/active_space", "all")], "levels.cas.active_space", "all", "must be one of 'auto'"),
    ([(f"{CAS}/states", "two")], "levels.cas.states", "two", "must be a whole number"),
    ([(f"{CC}/follow", "lowest-one")], "levels.cc.follow", "lowest-one", "must be one of 'anchor', 'lowest'"),
    ([(f"{OH}/levels", "cc")], "scans.one-oh.levels", "cc", "must be a list"),
    ([(f"{OH}/stretch/bond", "O1-H2")], "scans.one-oh.stretch.bond", "O1-H2", "must be a list of two"),
    ([(f"{OH}/stretch/bond", ["O1"])], "scans.one-oh.stretch.bond", ["O1"], "must be a list of two"),
    ([(f"{OH}/stretch/bond", ["O1", "H2", "H3"])], "scans.one-oh.stretch.bond", ["O1", "H2", "H3"], "list of two"),
    ([(LENGTHS, 1.0)], "scans.one-oh.stretch.lengths", 1.0, "must be a list of lengths or {from"),
    ([(LENGTHS, [1.0, "b"])], "scans.one-oh.stretch.lengths[1]", "b", "must be a number"),
    ([(f"{LENGTHS}/points", 10.0)], "scans.one-oh.stretch.lengths.points", 10.0, "must be a whole number"),
    ([(f"{LENGTHS}/spacing", "log")], "scans.one-oh.stretch.lengths.spacing", "log", "one of 'even', 'graded'"),
    ([("fit/models", ["parabola"])], "fit.models[0]", "parabola", "must be one of 'morse'"),
    ([("fit/models", [])], "fit.models", [], "is empty"),
    ([("diagnostics/thresholds", {"T1": 0.02})], "diagnostics.thresholds.T1", 0.02, "must be a mapping"),
    # unknown methods, functionals, bases, elements
    ([(f"{CC}/reference", "HF")], "levels.cc.reference", "HF", "must be one of 'RHF', 'UHF'"),
    ([(f"{CC}/correlation", "CCSDT")], "levels.cc.correlation", "CCSDT", "must be one of 'none', 'MP2'"),
    ([(f"{DFT}/functional", "B3LIP")], "levels.dft.functional", "B3LIP", "did you mean B3LYP"),
    ([(f"{DFT}/functional", "0.5*B88+LYP")], "levels.dft.functional", "0.5*B88+LYP", "not a known functional"),
    ([(f"{DFT}/functional", "PBE,nothing")], "levels.dft.functional", "PBE,nothing", "not a known functional"),
    ([(f"{DFT}/functional", "RSH(0.3,0,1)")], "levels.dft.functional", "RSH(0.3,0,1)", "not a known functional"),
    ([(f"{CC}/basis", "cc-pVDDZ")], "levels.cc.basis", "cc-pVDDZ", "not a basis that PySCF or the Basis Set"),
    ([(f"{CC}/basis", "../basis.dat")], "levels.cc.basis", "../basis.dat", "not a basis"),
    ([(f"{CC}/basis", "cc-pVDZ@3s2p")], "levels.cc.basis", "cc-pVDZ@3s2p", "not a basis"),
    ([(f"{CC}/basis", "unc-cc-pVDZ")], "levels.cc.basis", "unc-cc-pVDZ", "not a basis"),
    ([(f"{CC}/basis", "def2-SVP-JKFIT")], "levels.cc.basis", "def2-SVP-JKFIT", "not a basis"),
    ([(f"{CC}/basis", {"O": "cc-pVDZ", "H": "nix"})], "levels.cc.basis.H", "nix", "not a basis"),
    ([(f"{CC}/basis", {"default": "cc-pVDZ", "Q": "cc-pVDZ"})], "levels.cc.basis.Q", "Q", "is not an element"),
    ([(f"{CC}/basis", {"o": "cc-pVDZ", "default": "cc-pVDZ"})], "levels.cc.basis.o", "o", "did you mean O?"),
    ([(ATOMS, "X 0 0 0\nH 0 0 1")], "molecules.water.atoms line 1", "X", "is not an element"),
    ([(ATOMS, "O 0 0 0\nh 0 0 1")], "molecules.water.atoms line 2", "h", "did you mean H?"),
    ([(ATOMS, "O1 0 0 0\nH 0 0 1")], "molecules.water.atoms line 1", "O1", "is not an element"),
    # a basis that lacks an element
    ([(f"{CC}/basis", {"O": "cc-pVDZ"})], "levels.cc.basis", {"O": "cc-pVDZ"}, "has no basis for H"),
    ([("molecules/xenon", XENON), ("scans/xe", XENON_SCAN)], "levels.cc.basis", "cc-pVDZ", "no basis for Xe"),
    # atoms
    ([(ATOMS, "")], "molecules.water.atoms", "", "holds no atoms"),
    ([(ATOMS, "O 0 0\nH 0 0 1")], "molecules.water.atoms line 1", "O 0 0", "element x y z"),
    ([(ATOMS, "O 0 0 0 0\nH 0 0 1")], "molecules.water.atoms line 1", "O 0 0 0 0", "element x y z"),
    ([(ATOMS, "O 0 0 nan\nH 0 0 1")], "molecules.water.atoms line 1", "nan", "is not a finite number"),
    ([(ATOMS, "O 0 0 1e999\nH 0 0 1")], "molecules.water.atoms line 1", "1e999", "is not a finite number"),
    ([(ATOMS, "O 0 0 2*3\nH 0 0 1")], "molecules.water.atoms line 1", "2*3", "is not a finite number"),
    ([(ATOMS, "O 0 0 __import__('os')\nH 0 0 1")], "molecules.water.atoms line 1", "__import__('os')", "finite"),
    ([(ATOMS, "O 0 0 0\nH 0 0 1e6")], "molecules.water.atoms", 1e6 / 0.529177210544, "farther from the origin"),
    ([(ATOMS, "O 0 0 0\nH 0 0 1\nH 0 0 1")], "molecules.water.atoms", "H2, H3", "written twice"),
    ([("molecules/hydrogen/atoms", H_ON_H)], "molecules.hydrogen.atoms", "H1, H2", "lie 0.05 angstrom apart"),
    ([(f"{WATER}/xyz", "water.xyz")], "molecules.water.xyz", "water.xyz", "give one of the two"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", "no.xyz")], "molecules.water.xyz", "no.xyz", "is not a file"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", ".")], "molecules.water.xyz", ".", "is not a file"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", "short.xyz")], "molecules.water.xyz", 3, "but 2 lines of atoms follow"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", "words.xyz")], "molecules.water.xyz", "water", "the number of atoms"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", "typo.xyz")], "molecules.water.xyz line 2", "0,7", "not a finite number"),
    ([(ATOMS, DELETE), (f"{WATER}/xyz", "binary.xyz")], "molecules.water.xyz", "binary.xyz", "in UTF-8"),
    # charge and multiplicity
    ([(f"{WATER}/multiplicity", 2)], "molecules.water.multiplicity", 2, "does not fit 10 electrons (charge 0)"),
    ([(f"{WATER}/charge", 1)], "molecules.water.multiplicity", 1, "does not fit 9 electrons (charge 1)"),
    ([(f"{WATER}/charge", 10)], "molecules.water.charge", 10, "leaves 0 electrons"),
    ([(f"{WATER}/multiplicity", 0)], "molecules.water.multiplicity", 0, "must be at least 1"),
    ([(f"{WATER}/multiplicity", 13)], "molecules.water.multiplicity", 13, "needs 12 unpaired electrons"),
    # levels that make no sense
    ([(f"{CC}/correlation", "NEVPT2")], "levels.cc.correlation", "NEVPT2", "needs a CASSCF reference"),
    ([(f"{CAS}/correlation", "CCSD")], "levels.cas.correlation", "CCSD", "does not go on CASSCF"),
    ([(f"{CAS}/correlation", "FCI")], "levels.cas.correlation", "FCI", "does not go on CASSCF"),
    ([(f"{DFT}/correlation", "MP2")], "levels.dft.correlation", "MP2", "does not go on RKS"),
    ([(f"{DFT}/functional", None)], "levels.dft.functional", MISSING, "RKS needs one"),
    ([(f"{CC}/functional", "PBE0")], "levels.cc.functional", "PBE0", "does not go with RHF"),
    ([(f"{CC}/active_space", "auto")], "levels.cc.active_space", "auto", "does not go with RHF"),
    ([(f"{CAS}/active_space", None)], "levels.cas.active_space", MISSING, "CASSCF needs one"),
    ([(f"{CC}/states", 2)], "levels.cc.states", 2, "states need CASSCF"),
    ([(f"{CAS}/states", 0)], "levels.cas.states", 0, "must be at least 1"),
    ([("scans/radical/levels", ["cc"])], "scans.radical.levels[0]", "cc", "is RHF, for singlets"),
    ([("scans/radical/levels", ["dft"])], "scans.radical.levels[0]", "dft", "use UKS"),
    # active spaces that do not fit
    ([(f"{CAS}/active_space/electrons", 5)], "levels.cas.active_space.electrons", 5, "do not fit in 2 orbitals"),
    ([(f"{CAS}/active_space", {"electrons": 3, "orbitals": 3})], "levels.cas.active_space.electrons", 3, "even"),
    ([(f"{CAS}/active_space", {"electrons": 12, "orbitals": 8})], "levels.cas.active_space.electrons", 12, "the 10"),
    ([(f"{CAS}/active_space/orbitals", 25)], "levels.cas.active_space.orbitals", 25, "than the basis has (24)"),
    ([(f"{CAS}/active_space/orbitals", 0)], "levels.cas.active_space.orbitals", 0, "must be at least 1"),
    ([(f"{CAS}/states", 4)], "levels.cas.states", 4, "more than the 3 that the active space has"),
    ([("molecules/oxygen", TRIPLET_O), ("scans/oo", OXYGEN_SCAN), (f"{CAS}/active_space/orbitals", 1)],
     "levels.cas.active_space.orbitals", 1, "too few for 2 unpaired"),
    ([(f"{CAS}/active_space/atomic_orbitals", ["2p"])], "levels.cas.active_space.atomic_orbitals[0]", "2p", "'N 2p'"),
    ([(f"{CAS}/active_space/atomic_orbitals", ["N 2p"])],
     "levels.cas.active_space.atomic_orbitals[0]", "N 2p", "'water' does not hold"),
    ([(f"{CAS}/active_space/atomic_orbitals", ["H1 1s"])],
     "levels.cas.active_space.atomic_orbitals[0]", "H1 1s", "atom 1 is O1"),
    # too large, too small
    ([(f"{OH}/levels", ["fci"])], "levels.fci.correlation", "FCI", "determinants in molecule 'water'"),
    ([(f"{CAS}/active_space", {"electrons": 10, "orbitals": 24})],
     "levels.cas.active_space.orbitals", 24, "16 electrons in 16 orbitals"),
    ([(f"{LENGTHS}/points", 200_000)], "scans.one-oh.stretch.lengths.points", 200_000, "more than a scan may have"),
    ([("molecules/helium", {"charge": 0, "multiplicity": 1, "atoms": "He 0 0 0\nHe 0 0 3"}),
      ("scans/he", {"molecule": "helium", "levels": ["small"], "stretch": {"bond": ["He1", "He2"], "lengths": [3]}}),
      ("levels/small", {"reference": "RHF", "correlation": "MP2", "basis": "STO-3G"})],
     "levels.small.basis", "STO-3G", "leaves no empty orbitals"),
    # names
    ([("campaign", "../up")], "campaign", "../up", "is not a safe name"),
    ([("campaign", "")], "campaign", "", "is not a safe name"),
    ([("campaign", "good\n")], "campaign", "good\n", "is not a safe name"),
    ([("campaign", "a/b")], "campaign", "a/b", "is not a safe name"),
    ([("campaign", "häß")], "campaign", "häß", "is not a safe name"),
    ([("campaign", "x" * 65)], "campaign", "x" * 65, "longer than 64"),
    ([("campaign", "con")], "campaign", "con", "cannot be the name of a folder"),
    ([("levels/.hidden", GOOD["levels"]["cc"])], "levels..hidden", ".hidden", "is not a safe name"),
    ([("levels/-v", GOOD["levels"]["cc"])], "levels.-v", "-v", "is not a safe name"),
    ([("molecules/a b", GOOD["molecules"]["water"])], "molecules.a b", "a b", "is not a safe name"),
    ([("scans/ONE-OH", GOOD["scans"]["hh"])], "scans.ONE-OH", "ONE-OH", "differs from 'one-oh' only in case"),
    # references
    ([(f"{OH}/molecule", "watr")], "scans.one-oh.molecule", "watr", "is not a molecule of this campaign (water,"),
    ([(f"{OH}/levels", ["cc", "ccc"])], "scans.one-oh.levels[1]", "ccc", "is not a level of this campaign (cc,"),
    ([(f"{OH}/levels", ["cc", "cc"])], "scans.one-oh.levels[1]", "cc", "is listed twice"),
    ([(f"{OH}/levels", [])], "scans.one-oh.levels", [], "is empty"),
    ([("reference_level", "best")], "reference_level", "best", "is not a level of this campaign"),
    ([("diagnostics/thresholds", {"T9": {"value": 1.0, "source": "x"}})],
     "diagnostics.thresholds.T9", "T9", "is not a diagnostic (T1, D1)"),
    ([("diagnostics/thresholds", {"T1": {"value": 0.02}})], "diagnostics.thresholds.T1.source", MISSING, "missing"),
    ([("diagnostics/thresholds", {"T1": {"value": 0.02, "source": " "}})],
     "diagnostics.thresholds.T1.source", " ", "say where the value comes from"),
    ([("diagnostics/include", ["T7"])], "diagnostics.include[0]", "T7", "is not a diagnostic"),
    ([("fit/models", ["morse", "morse"])], "fit.models[1]", "morse", "is listed twice"),
    # bonds
    ([(f"{OH}/stretch/bond", ["O1", "H9"])], "scans.one-oh.stretch.bond[1]", "H9", "which has 3 (O1, H2, H3)"),
    ([(f"{OH}/stretch/bond", ["H1", "H2"])], "scans.one-oh.stretch.bond[0]", "H1", "atom 1 is O1"),
    ([(f"{OH}/stretch/bond", ["O1", "H0"])], "scans.one-oh.stretch.bond[1]", "H0", "is not an atom label"),
    ([(f"{OH}/stretch/bond", ["O", "H2"])], "scans.one-oh.stretch.bond[0]", "O", "is not an atom label"),
    ([(f"{OH}/stretch/bond", ["H2", "H2"])], "scans.one-oh.stretch.bond", ["H2", "H2"], "the same atom twice"),
    ([("scans/ring", RING)], "scans.ring.stretch.bond", ["C1", "C2"], "part of a ring"),
    ([(f"{OH}/stretch/move", ["H3"])], "scans.one-oh.stretch.move", ["H3"], "exactly one of the bond's atoms"),
    ([(f"{OH}/stretch/move", ["O1", "H2"])], "scans.one-oh.stretch.move", ["O1", "H2"], "exactly one of"),
    ([(f"{OH}/stretch/move", ["H2", "H2"])], "scans.one-oh.stretch.move[1]", "H2", "is listed twice"),
    ([(f"{OH}/stretch/move", ["H7"])], "scans.one-oh.stretch.move[0]", "H7", "is not an atom of the molecule"),
    ([(f"{OH}/stretch/move", [])], "scans.one-oh.stretch.move", [], "is empty"),
    # lengths
    ([(f"{LENGTHS}/from", -1.0)], "scans.one-oh.stretch.lengths.from", -1.0, "must be above 0"),
    ([(f"{LENGTHS}/from", 0)], "scans.one-oh.stretch.lengths.from", 0, "must be above 0"),
    ([(f"{LENGTHS}/from", 11.0)], "scans.one-oh.stretch.lengths.to", 10.0, "must be above from (11)"),
    ([(f"{LENGTHS}/from", 10.0)], "scans.one-oh.stretch.lengths.points", 40, "are the same point"),
    ([(f"{LENGTHS}/points", 0)], "scans.one-oh.stretch.lengths.points", 0, "must be at least 1"),
    ([(f"{LENGTHS}/points", 1)], "scans.one-oh.stretch.lengths.points", 1, "must be at least 2 for a range"),
    ([(f"{LENGTHS}/to", float("inf"))], "scans.one-oh.stretch.lengths.to", float("inf"), "must be a finite"),
    ([(LENGTHS, [])], "scans.one-oh.stretch.lengths", [], "is empty"),
    ([(LENGTHS, [1.0, 0.9])], "scans.one-oh.stretch.lengths[1]", 0.9, "lengths increase"),
    ([(LENGTHS, [1.0, 1.0])], "scans.one-oh.stretch.lengths[1]", 1.0, "lengths increase"),
    ([(LENGTHS, [-1.0, 1.0])], "scans.one-oh.stretch.lengths[0]", -1.0, "must be above 0"),
    ([(LENGTHS, [1.0, float("inf")])], "scans.one-oh.stretch.lengths[1]", float("inf"), "must be a finite"),
    ([(f"{LENGTHS}/from", 0.05)], "scans.one-oh.stretch.lengths", 0.05, "puts O1 and H2 0.05 angstrom apart"),
    ([(f"{OH}/stretch", {"bond": ["H3", "H2"], "move": ["H2"], "lengths": [0.0500001, 1.5]})],
     "scans.one-oh.stretch.lengths", 0.0500001, "puts H3 and H2 0.05 angstrom apart"),
]  # fmt: skip

TEXTS: list[tuple[str | bytes, str, Any, str]] = [
    ("campaign: [a\n", "line 2, column 1", "", "does not parse as YAML"),
    ("a: 1\nb: : 2\n", "line 2, column 4", "b: : 2", "does not parse as YAML"),
    ("a: 1\n\tb: 2\n", "line 2, column 1", "b: 2", "does not parse as YAML"),
    ("a: 1\n--- \nb: 2\n", "line 2, column 1", "---", "does not parse as YAML"),
    ("a: *nowhere\n", "line 1, column 4", "a: *nowhere", "does not parse as YAML"),
    ("a: \x07\n", "line 1, column 4", "\x07", "does not parse as YAML"),
    ("# Gr\xfc\xdfe\na: 1\n".encode("latin-1"), "line 1, column 5", b"\xfc", "is not UTF-8"),
    ("campaign: x\n".encode("utf-16"), "line 1, column 1", b"\xff", "is not UTF-8"),
    ("", "campaign file", None, "must be a mapping"),
    ("- a\n- b\n", "campaign file", ["a", "b"], "must be a mapping"),
    ("campaign: a\ncampaign: b\n", "campaign", "campaign", "written twice (again at line 2, column 1)"),
    ("molecules:\n  w: {}\n  w: {}\n", "molecules.w", "w", "written twice (again at line 3, column 3)"),
    ("campaign: !!python/object/apply:os.system [ls]\n", "campaign", "python/object/apply:os.system", "YAML tag"),
    ("campaign: !include other.yaml\n", "campaign", "!include", "YAML tag"),
    ("molecules:\n  1: {}\n", "molecules", "1", "line 2, column 3) is not a text"),
    ("molecules:\n  true: {}\n", "molecules", "true", "is not a text"),
    ("a: &a [1]\nb: [*a, " + "*a, " * 999 + "*a]\nc: &c {x: &x [*x]}\n", "campaign file", MISSING, "refers to itself"),
    ("[" * 20_000, "campaign file", MISSING, "nested deeper"),
    ("# " + "x" * 300_000, "campaign file", 262_145, "bytes are too many"),
]  # fmt: skip

XYZ_FILES = {
    "short.xyz": b"3\nwater\nO 0 0 0\nH 0 0 1\n",
    "words.xyz": b"water\nO 0 0 0\n",
    "typo.xyz": b"2\n\nO 0 0 0\nH 0 0,7 0\n",
    "binary.xyz": b"2\n\xff\xfe\n",
}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """A folder with broken xyz files."""
    for name, content in XYZ_FILES.items():
        (tmp_path / name).write_bytes(content)
    return tmp_path


def test_the_campaign_that_is_broken_below_is_good(folder: Path) -> None:
    """Without any change the campaign loads."""
    campaign = load(GOOD, folder)

    assert isinstance(campaign, Campaign)


@pytest.mark.parametrize(
    ("edits", "path", "value", "rule"), BROKEN, ids=[f"{n}-{b[1]}" for n, b in enumerate(BROKEN)]
)
def test_one_change_is_found(
    folder: Path, edits: list[tuple[str, Any]], path: str, value: Any, rule: str
) -> None:
    """A single mistake is one problem, with its path, value and rule."""
    with pytest.raises(CampaignError) as caught:
        load(changed(*edits), folder)
    (problem,) = caught.value.problems

    assert (problem.path, rule in problem.rule) == (path, True), str(problem)
    assert problem.value == (pytest.approx(value) if isinstance(value, float) else value)


@pytest.mark.parametrize(("text", "path", "value", "rule"), TEXTS, ids=range(len(TEXTS)))
def test_a_broken_text_is_found(folder: Path, text: str | bytes, path: str, value: Any, rule: str) -> None:
    """What is wrong with the text itself is reported with its line and column, or the key."""
    with pytest.raises(CampaignError) as caught:
        load_text(text, folder)
    matching = [p for p in caught.value.problems if p.path == path and rule in p.rule]

    assert [p.value for p in matching] == [value], str(caught.value)


def test_many_aliases_are_refused_quickly(folder: Path) -> None:
    """Aliases of aliases, a billion entries if written out, are refused within a second."""
    lines = ["a0: &a0 [x, x, x, x, x, x, x, x, x]"]
    lines += [f"a{n}: &a{n} [{', '.join([f'*a{n - 1}'] * 9)}]" for n in range(1, 10)]
    start = time.perf_counter()
    with pytest.raises(CampaignError, match="more than 200000 entries"):
        load_text("\n".join(lines), folder)

    assert time.perf_counter() - start < 5.0


def test_problems_of_all_parts_come_at_once(folder: Path) -> None:
    """A malformed molecule hides neither the other molecules nor levels, scans, or the analysis."""
    edits = [
        (f"{WATER}/charge", "none"),
        ("molecules/hydrogen/atoms", H_ON_H),
        ("molecules/hydroxyl/multiplicity", 1),
        (f"{CC}/basis", "cc-pVDDZ"),
        (f"{CAS}/correlation", "CCSD"),
        (f"{OH}/levels", ["cc", "none"]),
        (f"{HH}/stretch/bond", ["H1", "F2"]),
        ("diagnostics/include", ["T7"]),
        ("fit/order", 2),
        ("reference_level", "best"),
    ]
    with pytest.raises(CampaignError) as caught:
        load(changed(*edits), folder)

    assert [problem.path for problem in caught.value.problems] == [
        "molecules.water.charge",
        "molecules.hydrogen.atoms",
        "molecules.hydroxyl.multiplicity",
        "levels.cc.basis",
        "levels.cas.correlation",
        "scans.one-oh.levels[1]",
        "scans.hh.stretch.bond[1]",
        "diagnostics.include[0]",
        "fit.order",
        "reference_level",
    ]


def test_a_scan_of_a_malformed_molecule_is_no_second_problem(folder: Path) -> None:
    """References to blocks that are there but wrong are not reported again."""
    with pytest.raises(CampaignError) as caught:
        load(changed((f"{WATER}/unit", "nm"), (f"{CC}/reference", "HF")), folder)

    assert [problem.path for problem in caught.value.problems] == [
        "molecules.water.unit",
        "levels.cc.reference",
    ]


def test_duplicate_keys_and_other_problems_come_together(folder: Path) -> None:
    """A key written twice does not end the search."""
    text = yaml.safe_dump(changed(("reference_level", "best")), sort_keys=False) + "fit: {}\n"
    with pytest.raises(CampaignError) as caught:
        load_text(text, folder)

    assert [problem.path for problem in caught.value.problems] == ["fit", "reference_level"]


def test_the_message_is_one_line_a_problem(folder: Path) -> None:
    """Each line gives path, value and rule."""
    with pytest.raises(CampaignError) as caught:
        load(changed((f"{OH}/levels", ["cc", "ccc"]), ("reference_level", "best")), folder)

    assert str(caught.value).splitlines()[0] == (
        "scans.one-oh.levels[1]: 'ccc' is not a level of this campaign (cc, ucc, dft, cas, fci)"
    )


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    """A path without a file is a problem of the campaign file, not a crash."""
    with pytest.raises(CampaignError, match="cannot be read: No such file"):
        load_campaign(tmp_path / "none.yaml")


GOOD_TEXT = yaml.safe_dump(GOOD, sort_keys=False)
MUTATION = st.tuples(
    st.integers(0, len(GOOD_TEXT)),
    st.integers(0, 12),
    st.one_of(
        st.text(max_size=8),
        st.sampled_from(
            ["null", "NO", "-1", "1e400", ".nan", "{}", "[]", ": ", "\n", "*a", "&a ", "!!float ", "~"]
        ),
    ),
)


@settings(max_examples=150, deadline=5000, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(MUTATION, min_size=1, max_size=3))
def test_any_text_is_a_campaign_or_a_campaign_error(
    tmp_path: Path, mutations: list[tuple[int, int, str]]
) -> None:
    """Whatever is typed into the file, loading it ends soon, with a campaign or its problems."""
    text = GOOD_TEXT
    for place, length, insert in mutations:
        text = text[:place] + insert + text[place + length :]
    try:
        outcome: Any = load_text(text.encode("utf-8", "surrogatepass"), tmp_path)
    except CampaignError as error:
        outcome = error.problems

    assert outcome


SCALARS = st.one_of(
    st.none(), st.booleans(), st.integers(-(10**30), 10**30), st.floats(), st.text(max_size=10),
    st.sampled_from(["cc", "water", "RHF", "CASSCF", "auto", "H1", "cc-pVDZ", 1, 2, 0.7]),
)  # fmt: skip
BLOCKS = st.recursive(
    SCALARS,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=5), inner, max_size=3),
)


def _paths(data: Any, path: str = "") -> list[str]:
    items = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    return [p for key, value in items for p in (f"{path}{key}", *_paths(value, f"{path}{key}/"))]


@settings(max_examples=200, deadline=5000, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.tuples(st.sampled_from(_paths(GOOD)), BLOCKS), min_size=1, max_size=3))
def test_any_value_anywhere_is_a_campaign_or_a_campaign_error(
    tmp_path: Path, edits: list[tuple[str, Any]]
) -> None:
    """Any value in place of any other ends with a campaign or with problems that have path and rule."""
    outermost_last = sorted(edits, key=lambda edit: -edit[0].count("/"))
    try:
        outcome: Any = load(changed(*outermost_last), tmp_path)
    except CampaignError as error:
        outcome = [problem for problem in error.problems if problem.path and problem.rule]

    assert outcome
