"""A good campaign that tests change in one place or another."""

import copy
from pathlib import Path
from typing import Any

import yaml
from scission.campaign import Campaign, load_campaign

GOOD: dict[str, Any] = yaml.safe_load(
    """
campaign: good
molecules:
  water:
    charge: 0
    multiplicity: 1
    unit: angstrom
    atoms: |
      O   0.0000   0.0000   0.1173
      H   0.0000   0.7572  -0.4692
      H   0.0000  -0.7572  -0.4692
  hydrogen: {charge: 0, multiplicity: 1, unit: angstrom, atoms: "H 0 0 0\\nH 0 0 0.7414"}
  cyclopropane:
    charge: 0
    multiplicity: 1
    unit: angstrom
    atoms: |
      C  0.0000  0.8715  0.0000
      C  0.7547 -0.4357  0.0000
      C -0.7547 -0.4357  0.0000
      H  0.0000  1.4567  0.9130
      H  0.0000  1.4567 -0.9130
      H  1.2616 -0.7284  0.9130
      H  1.2616 -0.7284 -0.9130
      H -1.2616 -0.7284  0.9130
      H -1.2616 -0.7284 -0.9130
  hydroxyl: {charge: 0, multiplicity: 2, unit: angstrom, atoms: "O 0 0 0\\nH 0 0 0.97"}
levels:
  cc: {reference: RHF, correlation: CCSD(T), basis: cc-pVDZ, frozen_core: true}
  ucc: {reference: UHF, correlation: CCSD, basis: cc-pVDZ}
  dft: {reference: RKS, functional: PBE0, basis: def2-SVP}
  cas: {reference: CASSCF, active_space: {electrons: 2, orbitals: 2}, correlation: NEVPT2, basis: cc-pVDZ}
  fci: {reference: RHF, correlation: FCI, basis: cc-pVDZ}
scans:
  one-oh:
    molecule: water
    levels: [cc, cas, dft]
    stretch:
      bond: [O1, H2]
      lengths: {from: 0.7, to: 10.0, points: 40, spacing: graded}
  hh:
    molecule: hydrogen
    levels: [fci, ucc]
    stretch: {bond: [H1, H2], lengths: [0.5, 0.7, 0.9]}
  radical:
    molecule: hydroxyl
    levels: [ucc]
    stretch: {bond: [O1, H2], lengths: [0.9, 1.0]}
diagnostics: {thresholds: {}}
fit: {models: [morse, extended-rydberg]}
reference_level: null
"""
)

DELETE = object()


def changed(*edits: tuple[str, Any]) -> dict[str, Any]:
    """The good campaign with values set, added or deleted at dotted paths (numbers index lists)."""
    data = copy.deepcopy(GOOD)
    for path, value in edits:
        *parents, last = (int(part) if part.isdigit() else part for part in path.split("/"))
        block: Any = data
        for part in parents:
            block = block[part]
        if value is DELETE:
            del block[last]
        else:
            block[last] = value
    return data


def load(data: Any, folder: Path) -> Campaign:
    """The campaign in plain data, through a file."""
    return load_text(yaml.safe_dump(data, sort_keys=False), folder)


def load_text(text: str | bytes, folder: Path) -> Campaign:
    """The campaign in a text, through a file."""
    file = folder / "campaign.yaml"
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    return load_campaign(file, diagnostic_names=["T1", "D1"])
