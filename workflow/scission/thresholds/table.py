"""The table of thresholds: value, range of validity, source and provenance of each.

A number without a published source says so.  Diagnostics that are not in the table are shown, never judged.
"""

from scission.thresholds.types import FOUND, MEMORY, OWN, PRACTICE, Threshold

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
            f"{_TZT}; {_PULAY}, which chooses active orbitals", MEMORY, strong=0.5,
            strong_source=f"{OWN}: UHF breaks pairs early and overstates their breaking",
        ),
    ),
    "uhf_hono": (
        Threshold(
            "uhf_hono", 1.9, "below", "UHF natural orbitals, doubly occupied ones",
            f"{OWN}: the pair of the LUNO at 0.1; {_PULAY}, which chooses active orbitals", OWN,
            strong=1.5, strong_source=f"{OWN}: the pair of the LUNO at 0.5", near=1.92,
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
            _TZT, MEMORY, strong=1.80, strong_source=_PAIR, near=1.92,
        ),
    ),
    "c0_squared": (
        Threshold(
            "c0_squared", 0.90, "below", "CASSCF leading weight; falls as the space grows",
            "rule of the trade; see Sears and Sherrill, J. Phys. Chem. A 112, 3466 (2008); "
            "Jiang, DeYonker and Wilson, J. Chem. Theory Comput. 8, 460 (2012)", MEMORY,
            strong=0.80, strong_source=OWN, near=0.92,
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
            strong=-0.10, near=0.0, doubt=-0.03,
            strong_source=f"{OWN}: stretched H2 and N2 (cc-pVDZ) pass it at a CASSCF LUNO of 0.1 to 0.2",
        ),
    ),
    "z_s1": (
        Threshold(
            "z_s1", 0.1, "above", "active spaces of the valence orbitals",
            "Stein and Reiher, Mol. Phys. 115, 2110 (2017): below 0.1 single, above 0.2 multi", MEMORY,
            strong=0.2, strong_source="same source",
        ),
    ),
    "cc_luno": (
        Threshold(
            "cc_luno", 0.10, "above", "CCSD natural orbitals, closed shells, as long as CCSD holds",
            _TZT, MEMORY, strong=0.20, strong_source=_PAIR,
        ),
    ),
    "cc_hono": (
        Threshold(
            "cc_hono", 1.90, "below", "CCSD natural orbitals, closed shells, as long as CCSD holds",
            _TZT, MEMORY, strong=1.80, strong_source=_PAIR, near=1.92,
        ),
    ),
    "tae_share": (
        Threshold(
            "tae_share", 5.0, "above", "share in percent of (T) in the binding energy, about the minimum",
            "Karton, Rabinovich, Martin and Ruscic, J. Chem. Phys. 125, 144108 (2006); "
            "Karton, Daon and Martin, Chem. Phys. Lett. 510, 165 (2011): moderate from 5, severe from 10",
            FOUND,
            strong=10.0, strong_source="same source",
        ),
    ),
    "n_fod": (
        Threshold(
            "n_fod", 0.1, "above", "TPSS at 5000 K; grows with the size of the molecule", OWN, OWN,
            strong=0.5, strong_source=OWN,
        ),
    ),
    "b1": (
        Threshold(
            "b1", 10.0, "above", "kcal/mol for one bond, main-group molecules and metals",
            "Schultz, Zhao and Truhlar, J. Phys. Chem. A 109, 11127 (2005)", MEMORY,
            strong=20.0, strong_source=_TWICE,
        ),
    ),
}  # fmt: skip
