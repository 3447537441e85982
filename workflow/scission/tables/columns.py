"""Every column of every table: name, type, unit, meaning.

The one source for the files, their Parquet metadata and the documentation.  The first columns of
each table are a contract with whoever reads the files; further ones are added behind them.
"""

from __future__ import annotations

from typing import NamedTuple

from scission.records.schema import FLAGS, STATUSES

_PANDAS = {"str": "str", "float": "float64", "int": "Int64", "bool": "boolean"}


class Column(NamedTuple):
    """One column: ``dtype`` is ``str``, ``float``, ``int`` or ``bool``; ``unit`` is "1" for none."""

    name: str
    dtype: str
    unit: str
    meaning: str

    @property
    def pandas_dtype(self) -> str:
        """The type in a pandas frame, one that has a missing value."""
        return _PANDAS[self.dtype]


_SCAN = Column("scan", "str", "1", "name of the scan in the campaign file")
_LEVEL = Column("level", "str", "1", "name of the level in the campaign file")
_POINT = Column("point", "int", "1", "number of the point along the scan, from 1")
_COORDINATE = Column("coordinate_angstrom", "float", "angstrom", "length of the stretched bond")
_DIAGNOSTIC = Column("diagnostic", "str", "1", "name of the diagnostic")
_MODEL = Column("model", "str", "1", "curve model; local-polynomial is the fit about the minimum")
_STATUS = Column("status", "str", "1", f"how the calculation ended: {', '.join(STATUSES)}")
_REASON = Column("reason", "str", "1", "why it did not succeed, from a fixed list; empty if it did")
_MESSAGE = Column("message", "str", "1", "the same in one line for a person")
_ATTEMPTS = Column("attempts", "int", "1", "how often the calculation was started")
_STAGE = Column("stage", "str", "1", "step that ended so: reference or correlate")
_KEY = Column("key", "str", "1", "identity of the calculation; names its file in records/")
_WHERE = (_SCAN, _LEVEL, _POINT, _COORDINATE)

COLUMNS: dict[str, tuple[Column, ...]] = {
    "points": (
        *_WHERE,
        _STATUS,
        Column("energy_hartree", "float", "hartree", "total energy; of the lowest state if several"),
        Column("flag", "str", "1", f"verdict on the point: {', '.join(FLAGS)}"),
        Column("reasons", "str", "1", "the verdict's reasons in words"),
        _ATTEMPTS,
        Column("wall_s", "float", "s", "wall time of the calculation"),
        _REASON,
        _MESSAGE,
        _STAGE,
        Column("remedy", "str", "1", "what was done differently in the last attempt; empty for nothing"),
        _KEY,
        Column(
            "relative_energy_ev", "float", "eV", "energy above the level's own minimum, else lowest point"
        ),
        Column("energy_reference_hartree", "float", "hartree", "total energy of the reference wavefunction"),
        Column("energy_correlation_hartree", "float", "hartree", "correlation energy on top of it"),
        Column("cpu_s", "float", "s", "processor time of the calculation"),
        Column("peak_memory_mb", "float", "MB", "largest resident memory of the process"),
        Column("mean_grade", "float", "1", "how far the diagnostics speak against one determinant, 0 to 2"),
        Column(
            "error_kcal_per_mol",
            "float",
            "kcal/mol",
            "energy against the reference level, zero at that level's minimum",
        ),
    ),
    "verdicts": (
        _SCAN,
        _LEVEL,
        Column("flag", "str", "1", "flag of a stretch of neighbouring points"),
        Column("from_angstrom", "float", "angstrom", "first point of the stretch"),
        Column("to_angstrom", "float", "angstrom", "last point of the stretch"),
        Column("points", "int", "1", "number of points"),
        Column("reasons", "str", "1", "the verdict's reasons at the first point, in words"),
    ),
    "diagnostics": (
        *_WHERE,
        _DIAGNOSTIC,
        Column("value", "float", "see unit", "value of the diagnostic; empty if it has no meaning here"),
        Column("threshold", "float", "see unit", "value at which it counts as over; empty for none"),
        Column("over", "bool", "1", "whether the value lies beyond the threshold; empty if unknown"),
        Column("symbol", "str", "1", "published symbol"),
        Column("unit", "str", "1", "unit of value and threshold"),
        Column("direction", "str", "1", "side of the threshold that is over: above or below"),
        Column("threshold_source", "str", "1", "where the threshold comes from"),
        Column("remark", "str", "1", "why there is no value"),
    ),
    "fits": (
        _SCAN,
        _LEVEL,
        _MODEL,
        Column("quantity", "str", "1", "usual symbol of the quantity: r_e, D_e, k_e, omega_e ..."),
        Column("value", "float", "see unit", "fitted value"),
        Column("stderr", "float", "see unit", "standard error of the fit; empty where none can be given"),
        Column("unit", "str", "1", "unit of value and stderr"),
        Column("preferred", "bool", "1", "whether the model is the preferred one for this curve"),
    ),
    "models": (
        _SCAN,
        _LEVEL,
        _MODEL,
        Column("status", "str", "1", "fitted or not fitted"),
        Column("preferred", "bool", "1", "whether the model is the preferred one for this curve"),
        Column("points_used", "int", "1", "number of points the fit used"),
        Column("reduced_mass_dalton", "float", "Da", "reduced mass behind the constants; empty for none"),
        Column("message", "str", "1", "what the fit has to say, or why there is none"),
        Column("choice", "str", "1", "criterion by which the preferred model was chosen"),
    ),
    "residuals": (
        *_WHERE,
        _MODEL,
        Column("used", "bool", "1", "whether the fit used the point"),
        Column("why_left_out", "str", "1", "why it did not"),
        Column("residual_hartree", "float", "hartree", "energy of the point minus that of the model"),
    ),
    "onsets": (
        _SCAN,
        _LEVEL,
        _DIAGNOSTIC,
        Column("onset_angstrom", "float", "angstrom", "where the diagnostic crosses its threshold"),
        Column("lower_angstrom", "float", "angstrom", "grid point before the crossing"),
        Column("upper_angstrom", "float", "angstrom", "grid point behind the crossing"),
        Column("threshold", "float", "see diagnostics", "value that is crossed"),
        Column("what", "str", "1", "the crossing in words; also why there is none"),
    ),
    "crossings": (
        _SCAN,
        _LEVEL,
        Column("from_angstrom", "float", "angstrom", "last point on the one solution"),
        Column("to_angstrom", "float", "angstrom", "first point on the other"),
        Column("overlap", "float", "1", "overlap of the two neighbouring wavefunctions"),
        Column("energy_step_hartree", "float", "hartree", "step of the energy against a smooth curve"),
        Column("what", "str", "1", "the crossing in words"),
    ),
    "comparison": (
        _SCAN,
        _LEVEL,
        Column("reference_level", "str", "1", "level that the level is compared with"),
        Column("quantity", "str", "1", "measure of the difference: npe, largest_error ..."),
        Column("value", "float", "see unit", "its value"),
        Column("unit", "str", "1", "its unit"),
        Column("what", "str", "1", "what the quantity is; for the ends of the trusted interval why there"),
    ),
    "scorecard": (
        _DIAGNOSTIC,
        Column("threshold", "float", "see diagnostics", "published threshold"),
        Column("hits", "int", "1", "points over the threshold where the level was in error"),
        Column("false_alarms", "int", "1", "points over the threshold where it was not"),
        Column("best_threshold", "float", "see diagnostics", "threshold that separates the two best"),
        Column("level", "str", "1", "level whose error the diagnostic foretells"),
        Column("misses", "int", "1", "points within the threshold where the level was in error"),
        Column("correct", "int", "1", "points within the threshold where it was not"),
        Column("skill", "float", "1", "share of errors found less share of false alarms, -1 to 1"),
        Column("best_hits", "int", "1", "hits at the best threshold"),
        Column("best_misses", "int", "1", "misses at the best threshold"),
        Column("best_false_alarms", "int", "1", "false alarms at the best threshold"),
        Column("best_skill", "float", "1", "skill at the best threshold"),
        Column(
            "late_angstrom", "float", "angstrom", "onset less end of the trusted interval, mean of the scans"
        ),
        Column("earliest_angstrom", "float", "angstrom", "the same, smallest; negative warns in time"),
        Column("latest_angstrom", "float", "angstrom", "the same, largest; positive warns too late"),
        Column("scans", "int", "1", "number of scans that have both lengths"),
    ),
    "limits": (
        _SCAN,
        _LEVEL,
        Column("coordinate_angstrom", "float", "angstrom", "farthest length with a result"),
        Column("far_energy_hartree", "float", "hartree", "total energy there"),
        Column("fragment_sum_hartree", "float", "hartree", "lowest sum of the fragments' energies"),
        Column("difference_kcal_per_mol", "float", "kcal/mol", "far energy minus fragment sum"),
        Column("difference_ev", "float", "eV", "the same"),
        Column("ionic_sum_hartree", "float", "hartree", "lowest sum with one electron moved; empty for none"),
        Column("limit", "str", "1", "where the level goes, in one or two words"),
        Column("what", "str", "1", "the same in a sentence"),
        Column("fragments", "str", "1", "the fragments behind the sum, with their spins"),
        Column("ions", "str", "1", "the ions behind the ionic sum"),
        Column("d_e_ev", "float", "eV", "fragment sum minus the minimum of the level"),
        Column("remark", "str", "1", "fragments without an energy, and why"),
    ),
    "bond_picture": (
        *_WHERE,
        Column("quantity", "str", "1", "bond_ and transfer_: orthogonal form; vb_: non-orthogonal form"),
        Column("value", "float", "1", "its value"),
        Column("unit", "str", "1", "its unit"),
    ),
    "notes": (
        _SCAN,
        _LEVEL,
        Column("subject", "str", "1", "what the remark is about: active_space, start ..."),
        Column("note", "str", "1", "the remark"),
        Column("points", "int", "1", "number of points it was made on"),
        Column("from_angstrom", "float", "angstrom", "shortest length of these points"),
        Column("to_angstrom", "float", "angstrom", "longest length of these points"),
    ),
    "states": (
        *_WHERE,
        Column("state", "int", "1", "number of the state in the order of energy, from 1"),
        Column("label", "int", "1", "label that follows the state through crossings"),
        Column("energy_hartree", "float", "hartree", "total energy of the state"),
    ),
    "failures": (
        *_WHERE,
        _STAGE,
        _STATUS,
        _REASON,
        _MESSAGE,
        _ATTEMPTS,
        Column("remedy", "str", "1", "what to do differently when computed again; empty: next on the ladder"),
        _KEY,
    ),
}
"""Table name to its columns, in the order of the file."""
