"""Thresholds of the diagnostics: value, range of validity and source of each.

``THRESHOLDS`` maps the name of a diagnostic to its thresholds, one a kind of molecule.  Beyond
``value`` a diagnostic casts doubt on a single reference; beyond ``strong`` it does so strongly.  A number
without a published source says so in ``provenance``.  ``homo_lumo_gap`` and ``s2`` are shown, never judged.
"""

from collections.abc import Mapping
from dataclasses import dataclass
from math import isfinite
from typing import Literal

Direction = Literal["above", "below"]
Spin = Literal["any", "singlet", "open-shell"]

FOUND = "read in a secondary copy of the source"
MEMORY = "from memory"
PRACTICE = "common practice, no source"
OWN = "this project's choice"


@dataclass(frozen=True)
class Threshold:
    """A threshold of one diagnostic, in the diagnostic's own unit.

    ``direction`` is the side on which doubt lies; ``spin`` the molecules it applies to.  With
    ``per_spin`` the values are fractions of S(S+1).  ``strong_source`` belongs to ``strong``.
    """

    name: str
    value: float
    direction: Direction
    valid_for: str
    source: str
    provenance: str
    spin: Spin = "any"
    strong: float | None = None
    strong_source: str = ""
    per_spin: bool = False

    def scaled(self, multiplicity: int) -> tuple[float, float | None]:
        """Value and strong value for a spin multiplicity."""
        if not self.per_spin:
            return self.value, self.strong
        s = (multiplicity - 1) / 2.0
        factor = s * (s + 1.0)
        return self.value * factor, None if self.strong is None else self.strong * factor


@dataclass(frozen=True)
class Override:
    """A campaign's own threshold; ``source`` is required, ``strong`` optional."""

    value: float
    source: str
    strong: float | None = None


Thresholds = Mapping[str, tuple[Threshold, ...]]

_PULAY = "Pulay and Hamilton, J. Chem. Phys. 88, 4926 (1988): fractional if 0.02 < n < 1.98"
_TZT = (
    "cf. the M diagnostic, large above 0.10: "
    "Tishchenko, Zheng and Truhlar, J. Chem. Theory Comput. 4, 1208 (2008)"
)
_TWICE = f"{OWN}: twice the threshold"
_PAIR = f"{OWN}: two electrons in two orbitals reach it where C0^2 falls to 0.90"

THRESHOLDS: dict[str, tuple[Threshold, ...]] = {
    "t1": (
        Threshold(
            "t1", 0.02, "above", "closed-shell main-group molecules, RHF-based CCSD",
            "Lee and Taylor, Int. J. Quantum Chem. Symp. 23, 199 (1989)", MEMORY,
            spin="singlet", strong=0.04, strong_source=_TWICE,
        ),
        Threshold(
            "t1", 0.044, "above", "open-shell molecules, ROHF-based CCSD",
            "Rienstra-Kiracofe, Allen and Schaefer, J. Phys. Chem. A 104, 9823 (2000)", MEMORY,
            spin="open-shell", strong=0.088, strong_source=_TWICE,
        ),
    ),
    "d1": (
        Threshold(
            "d1", 0.05, "above", "closed-shell main-group molecules, RHF-based CCSD",
            "Janssen and Nielsen, Chem. Phys. Lett. 290, 423 (1998)", MEMORY,
            strong=0.10, strong_source=_TWICE,
        ),
    ),
    "d2": (
        Threshold(
            "d2", 0.18, "above", "closed-shell main-group molecules, RHF-based CCSD or MP2",
            "Nielsen and Janssen, Chem. Phys. Lett. 310, 568 (1999)", MEMORY,
            strong=0.30,
            strong_source=f"{OWN}: stretched H2 and HF in cc-pVDZ reach it where the CASSCF LUNO reaches 0.2",
        ),
    ),
    "largest_t2": (
        Threshold(
            "largest_t2", 0.1, "above", "coupled cluster on restricted orbitals",
            "rule of the trade, given as 0.1 to 0.2", PRACTICE,
            strong=0.2, strong_source="upper end of the same rule",
        ),
    ),
    "triples_share": (
        Threshold(
            "triples_share", 5.0, "above", "share in percent of (T) in the CCSD(T) correlation energy",
            "no published threshold for this share; CCSD(T)/cc-pVDZ, frozen core, at equilibrium: H2O 1.4, "
            "F2 2.2, N2 3.7 lie below, O3 5.2, C2 8.1 above", OWN,
            strong=8.0, strong_source=f"{OWN}: C2 at equilibrium lies above",
        ),
    ),
    "s2_excess": (
        Threshold(
            "s2_excess", 0.1, "above", "unrestricted singlets",
            "a singlet has no S(S+1) to take a part of: absolute value", PRACTICE,
            spin="singlet", strong=0.5,
            strong_source=f"{OWN}: half way to the two separate doublets of a broken pair, <S^2> = 1",
        ),
        Threshold(
            "s2_excess", 0.10, "above", "unrestricted open-shell molecules, as a part of S(S+1)",
            "Young, Computational Chemistry (2001): above 10 % of S(S+1) is suspicious", MEMORY,
            spin="open-shell", strong=0.50, strong_source=OWN, per_spin=True,
        ),
    ),
    "uhf_luno": (
        Threshold(
            "uhf_luno", 0.1, "above", "UHF natural orbitals of molecules with even occupation expected",
            _TZT, MEMORY, strong=0.4,
            strong_source=f"{OWN}: UHF breaks pairs early and overstates their breaking",
        ),
    ),
    "uhf_hono": (
        Threshold(
            "uhf_hono", 1.98, "below", "UHF natural orbitals, doubly occupied ones",
            _PULAY, FOUND, strong=1.6, strong_source=f"{OWN}: the pair of the LUNO at 0.4",
        ),
    ),
    "luno": (
        Threshold(
            "luno", 0.10, "above", "CASSCF natural orbitals, the active space holding the stretched bond",
            _TZT, MEMORY, strong=0.20, strong_source=_PAIR,
        ),
    ),
    "hono": (
        Threshold(
            "hono", 1.90, "below", "CASSCF natural orbitals, the active space holding the stretched bond",
            _TZT, MEMORY, strong=1.80, strong_source=_PAIR,
        ),
    ),
    "c0_squared": (
        Threshold(
            "c0_squared", 0.90, "below", "CASSCF leading weight; falls as the space grows",
            "rule of the trade; see Sears and Sherrill, J. Phys. Chem. A 112, 3466 (2008); "
            "Jiang, DeYonker and Wilson, J. Chem. Theory Comput. 8, 460 (2012)", MEMORY,
            strong=0.80, strong_source=OWN,
        ),
    ),
    "m_diagnostic": (
        Threshold(
            "m_diagnostic", 0.05, "above", "CASSCF natural occupations",
            "Tishchenko, Zheng and Truhlar, J. Chem. Theory Comput. 4, 1208 (2008)", MEMORY,
            strong=0.10, strong_source="same source: large above 0.10",
        ),
    ),
    "triplet_stability": (
        Threshold(
            "triplet_stability", 0.0, "below", "restricted determinants: lowest eigenvalue, RHF to UHF",
            "definition: below zero an unrestricted determinant lies lower; "
            "Cizek and Paldus, J. Chem. Phys. 47, 3976 (1967)", MEMORY,
        ),
    ),
}  # fmt: skip


def threshold_for(name: str, multiplicity: int, thresholds: Thresholds = THRESHOLDS) -> Threshold | None:
    """The threshold of a diagnostic for a spin multiplicity; None where there is none."""
    spin: Spin = "singlet" if multiplicity == 1 else "open-shell"
    return next((t for t in thresholds.get(name, ()) if t.spin in ("any", spin)), None)


def limit(name: str, multiplicity: int, thresholds: Thresholds = THRESHOLDS) -> float:
    """The number to compare a diagnostic with, as tables show it; NaN where there is none."""
    threshold = threshold_for(name, multiplicity, thresholds)
    return float("nan") if threshold is None else threshold.scaled(multiplicity)[0]


def is_over(value: float, bound: float, direction: Direction) -> bool:
    """True where a value lies strictly on the doubtful side of a bound; False for NaN."""
    return value > bound if direction == "above" else value < bound


def problems(overrides: Mapping[str, Override]) -> list[str]:
    """Everything that is wrong with a campaign's overrides: name, value, rule, one line each."""
    found = []
    for name, override in overrides.items():
        where = f"diagnostics.thresholds.{name}"
        if name not in THRESHOLDS:
            found.append(f"{where}: no diagnostic of this name has a threshold ({', '.join(THRESHOLDS)})")
            continue
        if not override.source.strip():
            found.append(f"{where}.source: {override.source!r}; an override needs the source of its value")
        if not isfinite(override.value):
            found.append(f"{where}.value: {override.value} is not a finite number")
        if override.strong is not None and not _beyond(name, override):
            found.append(f"{where}.strong: {override.strong} must lie beyond value {override.value}")
    return found


def _beyond(name: str, override: Override) -> bool:
    return override.strong is not None and is_over(
        override.strong, override.value, THRESHOLDS[name][0].direction
    )


def resolve(overrides: Mapping[str, Override]) -> dict[str, tuple[Threshold, ...]]:
    """The thresholds of a campaign: an override replaces all kinds of its diagnostic by one for any spin.

    An override without ``strong`` has none: the built-in one belongs to another value.

    Raises:
        ValueError: an unknown name, a missing source or a value out of range; all of them at once.
    """
    found = problems(overrides)
    if found:
        raise ValueError("\n".join(found))
    resolved = dict(THRESHOLDS)
    for name, override in overrides.items():
        resolved[name] = (_overridden(name, override),)
    return resolved


def _overridden(name: str, override: Override) -> Threshold:
    return Threshold(
        name,
        override.value,
        THRESHOLDS[name][0].direction,
        "as the campaign says",
        override.source,
        "set by the campaign",
        strong=override.strong,
        strong_source=override.source if override.strong is not None else "",
    )
