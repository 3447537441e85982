"""What a campaign file may say: one type per block, with a description of every key.

The JSON schema in ``config/`` is made from these types.  They check each value by itself; what only
shows when parts are seen together (a bond to an atom that is not there) is in ``checks_*``.
"""

from pathlib import Path
from typing import Annotated, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BeforeValidator, Discriminator, Field, PrivateAttr, Tag

from scission.campaign.conclusions import Comparison, Diagnostics, Fit
from scission.campaign.fields import (
    NAME,
    NAMES,
    Strict,
    as_tuple,
    kind_of,
    null_is_empty,
    null_is_none,
    or_null,
    ref_or_null,
)
from scission.campaign.problems import CampaignError
from scission.campaign.xyz import parse_atoms

Reference = Literal["RHF", "UHF", "ROHF", "RKS", "UKS", "CASSCF", "PAIR", "ORBITAL", "PAIR+IONIC"]
PICTURES = ("PAIR", "ORBITAL", "PAIR+IONIC")
"""References that are pictures of a two-electron bond over the orbitals of its free atoms."""
Correlation = Literal["none", "MP2", "CCSD", "CCSD(T)", "FCI", "NEVPT2"]

AtomPair = Annotated[tuple[str, str], BeforeValidator(as_tuple)]


class Molecule(Strict):
    """A molecule: its charge, its spin and where its atoms are."""

    charge: int = Field(ge=-100, le=100, description="Total charge, in elementary charges.", examples=[0])
    multiplicity: int = Field(
        ge=1, le=100, description="Spin multiplicity 2S+1: 1 singlet, 2 doublet, 3 triplet.", examples=[1]
    )
    unit: Literal["angstrom", "bohr"] = Field(
        "angstrom",
        description="Unit of the coordinates and of the lengths of its scans (xyz files: angstrom).",
    )
    atoms: str | None = Field(
        None,
        description="One atom a line: element x y z. Either this or xyz.",
        examples=["H 0.0 0.0 0.0\nF 0.0 0.0 0.917\n"],
    )
    xyz: str | None = Field(
        None,
        description="Path of an xyz file, relative to the campaign file. Either this or atoms.",
        examples=["geometries/water.xyz"],
    )
    _symbols: tuple[str, ...] = PrivateAttr(default=())
    _positions: NDArray[np.float64] | None = PrivateAttr(default=None)

    def place(self, symbols: tuple[str, ...], positions: NDArray[np.float64]) -> None:
        """Set the atoms: element symbols and positions of shape (n_atoms, 3), bohr."""
        positions.setflags(write=False)
        self._symbols, self._positions = symbols, positions

    @property
    def symbols(self) -> tuple[str, ...]:
        """Element symbols in the order given."""
        self._place_from_text()
        return self._symbols

    @property
    def positions(self) -> NDArray[np.float64]:
        """Positions, shape (n_atoms, 3), bohr, read only."""
        self._place_from_text()
        assert self._positions is not None
        return self._positions

    def _place_from_text(self) -> None:
        if self._positions is None:
            symbols, positions, problems = parse_atoms(self.atoms or "", self.unit)
            if problems:
                raise CampaignError(problems)
            self.place(symbols, positions)


class ActiveSpace(Strict):
    """Active space of a CASSCF level."""

    electrons: int = Field(ge=1, description="Number of active electrons.", examples=[2])
    orbitals: int = Field(ge=1, description="Number of active orbitals.", examples=[2])
    atomic_orbitals: list[str] | None = Field(
        None,
        min_length=1,
        description="Atomic orbitals that the active orbitals are picked for, e.g. 'N 2p' or 'N1 2p'; "
        "null: chosen automatically.",
        examples=[["N1 2p", "N2 2p"]],
    )


class Level(Strict):
    """A level of theory: reference, correlation method and basis."""

    reference: Reference = Field(
        description="Reference wavefunction or Kohn-Sham determinant, or a picture of a two-electron bond "
        "(PAIR, ORBITAL, PAIR+IONIC).",
        examples=["RHF"],
    )
    functional: str | None = Field(
        None, description="Density functional, for RKS and UKS only.", examples=["B3LYP", "PBE0", "PBE,PBE"]
    )
    correlation: Annotated[Correlation, BeforeValidator(null_is_none)] = Field(
        "none",
        description="Correlation method on top of the reference; NEVPT2 on CASSCF only. Null means none.",
        json_schema_extra=or_null,
    )
    basis: Annotated[
        Annotated[str, Tag("<text>")] | Annotated[dict[str, str], Field(min_length=1), Tag("<map>")],
        Discriminator(
            kind_of,
            custom_error_type="basis",
            custom_error_message="must be the name of a basis, or a mapping element: basis",
        ),
    ] = Field(
        description="Basis by name, or a mapping from element (and 'default') to name.",
        examples=["cc-pVDZ", {"H": "cc-pVDZ", "default": "aug-cc-pVDZ"}],
    )
    frozen_core: bool = Field(True, description="Leave core electrons out of the correlation treatment.")
    active_space: Annotated[
        Annotated[Literal["auto"], Tag("<text>")]
        | Annotated[ActiveSpace, Tag("<map>")]
        | Annotated[None, Tag("<null>")],
        Discriminator(
            kind_of,
            custom_error_type="active_space",
            custom_error_message="must be auto or {electrons: ..., orbitals: ...}",
        ),
    ] = Field(
        None,
        description="Active space, for CASSCF only and needed there; auto: valence orbitals of the bond.",
        examples=["auto", {"electrons": 2, "orbitals": 2}],
    )
    states: int = Field(1, ge=1, le=20, description="Number of states averaged with equal weights (CASSCF).")
    follow: Literal["anchor", "lowest"] | None = Field(
        None,
        description="Stay on the state of the anchor geometry, or take the lowest solution at each point; "
        "null: lowest for UHF and UKS, anchor for the others.",
    )

    @property
    def resolved_follow(self) -> Literal["anchor", "lowest"]:
        """``follow``, or the default of the reference; the pictures of the bond have one state only."""
        if self.reference in PICTURES:
            return "anchor"
        return self.follow or ("lowest" if self.reference in ("UHF", "UKS") else "anchor")

    @property
    def correlates_valence_only(self) -> bool:
        """True where core electrons are left out: the key matters only with a correlation method."""
        return self.frozen_core and self.correlation != "none"

    def basis_of(self, symbol: str) -> str | None:
        """Name of the basis for an element, None where the mapping has none."""
        if isinstance(self.basis, str):
            return self.basis
        return self.basis.get(symbol, self.basis.get("default"))


class Grid(Strict):
    """Evenly or gradually spaced lengths."""

    from_: float = Field(
        alias="from", gt=0, description="First length, in the molecule's unit.", examples=[0.7]
    )
    to: float = Field(gt=0, description="Last length, in the molecule's unit.", examples=[10.0])
    points: int = Field(ge=1, description="Number of lengths, both ends included.", examples=[40])
    spacing: Literal["even", "graded"] = Field("even", description="even, or graded: dense near the minimum.")


class Stretch(Strict):
    """One bond is stretched; the atoms on one side of it move as a rigid body."""

    bond: AtomPair = Field(
        description="The two atoms, each as element and number counted from 1 in the order given.",
        examples=[["O1", "H2"]],
    )
    lengths: Annotated[
        Annotated[Grid, Tag("<map>")] | Annotated[list[float], Field(min_length=1), Tag("<list>")],
        Discriminator(
            kind_of,
            custom_error_type="lengths",
            custom_error_message="must be a list of lengths or {from: ..., to: ..., points: ...}",
        ),
    ] = Field(
        description="Bond lengths, in the molecule's unit: a grid, or an increasing list.",
        examples=[{"from": 0.7, "to": 10.0, "points": 40, "spacing": "graded"}, [0.9, 1.0, 1.1]],
    )
    move: list[str] | None = Field(
        None,
        min_length=1,
        description="Atoms that move; null: the atoms bonded to the second atom of the bond.",
        examples=[["H2"]],
    )


class Scan(Strict):
    """One molecule taken along one coordinate at one or more levels."""

    molecule: str = Field(description="Name of a molecule of this campaign.", examples=["water"])
    levels: list[str] = Field(
        min_length=1, description="Names of levels of this campaign.", examples=[["cc"]]
    )
    stretch: Stretch | None = Field(None, description="The coordinate: a bond that is stretched.")


class Campaign(Strict):
    """A campaign of bond scans: molecules, levels of theory, and the scans that combine them."""

    name: str = Field(
        alias="campaign",
        description="Name of the campaign and of its folder under results/.",
        examples=["water-bond"],
        json_schema_extra=NAME,
    )
    molecules: dict[str, Molecule] = Field(
        min_length=1, description="Molecules by name.", json_schema_extra=NAMES
    )
    levels: dict[str, Level] = Field(
        min_length=1, description="Levels of theory by name.", json_schema_extra=NAMES
    )
    scans: dict[str, Scan] = Field(min_length=1, description="Scans by name.", json_schema_extra=NAMES)
    diagnostics: Annotated[Diagnostics, BeforeValidator(null_is_empty)] = Field(
        default_factory=Diagnostics,
        description="Thresholds and the rule of the flags, each change with a source; costly diagnostics.",
        json_schema_extra=ref_or_null,
    )
    fit: Annotated[Fit, BeforeValidator(null_is_empty)] = Field(
        default_factory=Fit, description="How curves are fitted.", json_schema_extra=ref_or_null
    )
    reference_level: str | None = Field(
        None, description="The level the others are compared with.", examples=["fci"]
    )
    comparison: Annotated[Comparison, BeforeValidator(null_is_empty)] = Field(
        default_factory=Comparison,
        description="How levels are compared with the reference level.",
        json_schema_extra=ref_or_null,
    )
    _source_text: str = PrivateAttr(default="")
    _directory: Path = PrivateAttr(default_factory=Path)

    @property
    def source_text(self) -> str:
        """The campaign file as given."""
        return self._source_text

    @property
    def directory(self) -> Path:
        """The folder the campaign file lies in."""
        return self._directory

    def keep_source(self, text: str, directory: Path) -> None:
        """Remember the file and its folder."""
        self._source_text, self._directory = text, directory
