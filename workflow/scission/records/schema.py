"""The record schema: every scalar and array a record may hold, with type, unit, shape and meaning.

It is the one source for HDF5 attributes, table columns and the documented list of fields.
"""

from __future__ import annotations

from typing import NamedTuple

SCHEMA_VERSION = 1

STATUSES = ("converged", "unconverged", "failed", "lost", "skipped")

REASONS = {
    "": "nothing to report",
    "not-converged": "iterations ran out before the criteria were met",
    "raised": "the calculation stopped with an error",
    "time-limit": "the calculation used up its time budget",
    "memory-limit": "the calculation used up its memory budget",
    "killed": "the calculation's process was killed from outside",
    "scheduler-limit": "the scheduler was about to end the job",
    "not-defined": "the level has no such state, as of a fragment whose share of the active space is too small",
    "reference-missing": "the reference wavefunction this point needs did not succeed",
    "not-finite": "the energy or an array is not a finite number",
    "bound-violated": "the energy lies below a bound that cannot be passed",
    "spin": "the wavefunction does not have the spin that was asked for",
    "lost": "the job vanished and left nothing",
    "damaged": "the record could not be read and was set aside",
}

FLAGS = {
    "single-reference": "one determinant describes the bond here",
    "borderline": "diagnostics disagree or lie near their thresholds",
    "multireference": "one determinant is not enough here",
    "undetermined": "there is no diagnostic to judge by",
}


class Field(NamedTuple):
    """One quantity of a record: numpy dtype, unit, shape (names of its axes) and meaning."""

    name: str
    dtype: str
    unit: str
    shape: tuple[str, ...]
    meaning: str


SCALARS = (
    Field("energy", "f8", "hartree", (), "total energy of the level; of the lowest state if several"),
    Field("energy_reference", "f8", "hartree", (), "total energy of the reference wavefunction"),
    Field("energy_correlation", "f8", "hartree", (), "correlation energy added to the reference"),
    Field("energy_triples", "f8", "hartree", (), "perturbative triples part of the correlation energy"),
    Field("energy_nuclear", "f8", "hartree", (), "repulsion of the nuclei"),
    Field("n_basis", "i8", "1", (), "number of basis functions"),
    Field("n_correlated", "i8", "1", (), "number of correlated electrons"),
    Field("coulson_fischer", "f8", "bohr", (), "length where the restricted determinant turns unstable"),
    Field("bond_order", "f8", "1", (), "effective bond order from the active natural occupations"),
    Field("bond_covalent", "f8", "1", (), "weight without charge transfer, orthogonal localised orbitals"),
    Field("bond_ionic_first", "f8", "1", (), "weight of electrons moved to the first fragment, orthogonal"),
    Field("bond_ionic_second", "f8", "1", (), "weight of electrons moved to the second fragment, orthogonal"),
    Field("vb_covalent", "f8", "1", (), "weight of the covalent structure, non-orthogonal fragment orbitals"),
    Field("vb_ionic_first", "f8", "1", (), "weight of both electrons on the first fragment, non-orthogonal"),
    Field(
        "vb_ionic_second", "f8", "1", (), "weight of both electrons on the second fragment, non-orthogonal"
    ),
    Field("vb_captured", "f8", "1", (), "share of the wavefunction that the fragments' orbitals capture"),
    Field("vb_overlap", "f8", "1", (), "overlap of the two fragments' orbitals"),
    Field("wall_s", "f8", "s", (), "wall time of the calculation"),
    Field("cpu_s", "f8", "s", (), "processor time of the calculation"),
    Field("peak_memory_mb", "f8", "MB", (), "largest resident memory of the process"),
)

ARRAYS = (
    Field("positions", "f8", "bohr", ("atom", "xyz"), "nuclear positions"),
    Field("state_energies", "f8", "hartree", ("state",), "total energies of the states, adiabatic order"),
    Field("state_labels", "i8", "1", ("state",), "label that follows each state through crossings"),
    Field("natural_occupations", "f8", "1", ("orbital",), "spin-summed natural occupations, decreasing"),
    Field(
        "orbital_weights",
        "f8",
        "1",
        ("orbital", "filling"),
        "probability of each natural orbital to be empty, hold alpha, hold beta, hold both",
    ),
    Field("orbital_energies", "f8", "hartree", ("spin", "mo"), "orbital energies of the reference"),
    Field("dipole", "f8", "e*bohr", ("xyz",), "dipole moment of the reference"),
    Field(
        "mo_lowdin",
        "f8",
        "1",
        ("spin", "ao", "mo"),
        "orbitals of the reference in symmetrically orthogonalised basis functions, S^1/2 C",
    ),
    Field("mo_occ", "f8", "1", ("spin", "mo"), "orbital occupations of the reference"),
    Field(
        "active", "i8", "1", ("part",), "inactive orbitals, active orbitals and active electrons of a CASSCF"
    ),
    Field(
        "amplitude_orbitals",
        "f8",
        "1",
        ("rank", "ao"),
        "leading natural orbitals that coupled-cluster amplitudes excite into, scaled by the root of their occupation",
    ),
    Field("ci", "f8", "1", ("state", "alpha_string", "beta_string"), "CI vectors of the active space"),
    Field(
        "transfer_weights",
        "f8",
        "1",
        ("electron",),
        "weights of configurations by the number of active electrons on the first fragment, from 0",
    ),
)

TOO_LARGE_TO_GATHER = tuple(item.name for item in ARRAYS if {"ao", "alpha_string"} & set(item.shape))
"""Arrays that stay in the records of the references; all others go to campaign.h5."""

POINT_TEXTS = (
    Field("status", "str", "1", (), f"how the calculation ended: {', '.join(STATUSES)}"),
    Field("reason", "str", "1", (), "why it did not succeed, from a short fixed list; empty if it did"),
    Field("message", "str", "1", (), "the same in one line for a person"),
    Field("key", "str", "1", (), "identity of the calculation; names its file in records/"),
    Field("remedy", "str", "1", (), "what was done differently in the last attempt; empty for nothing"),
    Field("flag", "str", "1", (), f"verdict on the point: {', '.join(FLAGS)}"),
    Field("reasons", "str", "1", (), "the verdict's reasons in words"),
)
"""What campaign.h5 says of a point in words; the last two come from the analysis."""
