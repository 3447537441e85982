"""A campaign whose records are made from formulas, for tests of what comes after the chemistry."""

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scission.campaign import Campaign, load_campaign
from scission.records import Record, Store
from scission.units import HARTREE_IN_EV

TEXT = """\
campaign: made-up
molecules:
  hf: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nF 0 0 0.917\\n"}
  n2: {charge: 0, multiplicity: 1, atoms: "N 0 0 0\\nN 0 0 1.1\\n"}
levels:
  ccsd-t: {reference: RHF, correlation: CCSD(T), basis: cc-pVDZ}
  uhf: {reference: UHF, basis: cc-pVDZ}
  cas: {reference: CASSCF, active_space: auto, correlation: NEVPT2, basis: cc-pVDZ}
scans:
  h-f:
    molecule: hf
    levels: [ccsd-t, uhf, cas]
    stretch: {bond: [H1, F2], lengths: {from: 0.6, to: 10.0, points: 30, spacing: graded}}
  n-n:
    molecule: n2
    levels: [ccsd-t, uhf, cas]
    stretch: {bond: [N1, N2], lengths: {from: 0.8, to: 3.0, points: 25}}
"""

WELLS = {"h-f": (0.917, 5.9, 2.2, -100.2), "n-n": (1.098, 9.9, 2.7, -109.3)}
"""r_e (angstrom), depth (eV), Morse range (1/angstrom) and energy of the minimum (hartree)."""


@dataclass(frozen=True)
class Planned:
    scan: str
    level: str
    number: int
    coordinate: tuple[float, ...]
    names: tuple[str, ...]
    key: str


def campaign(folder: Path, text: str = TEXT) -> Campaign:
    path = folder / "made-up.yaml"
    path.write_text(text)
    return load_campaign(path)


def lengths(scan: str) -> np.ndarray:
    if scan == "h-f":
        return np.round(np.geomspace(0.6, 10.0, 30), 4)
    return np.linspace(0.8, 3.0, 25)


def points() -> list[Planned]:
    return [
        Planned(scan, level, number, (float(length),), ("bond distance",), f"{scan}-{level}-{number:03d}")
        for scan in WELLS
        for level in ("ccsd-t", "uhf", "cas")
        for number, length in enumerate(lengths(scan), start=1)
    ]


def morse(scan: str, r: float, stretch: float = 1.0) -> float:
    r_e, depth, a, bottom = WELLS[scan]
    return bottom + stretch * depth / HARTREE_IN_EV * (1.0 - np.exp(-a * (r - r_e))) ** 2


def broken(scan: str, r: float) -> float:
    """Share of a broken bond, 0 to 1, growing with the length."""
    return float(1.0 / (1.0 + np.exp(-4.0 * (r / WELLS[scan][0] - 2.0))))


def record(point: Planned) -> Record:
    r, x = point.coordinate[0], broken(point.scan, point.coordinate[0])
    energy = {
        "ccsd-t": morse(point.scan, r) - 0.12 * x**2 * (r / 3.0),
        "uhf": morse(point.scan, r, 0.72) + 0.1,
        "cas": morse(point.scan, r, 0.97) + 0.02,
    }[point.level]
    diagnostics = {
        "ccsd-t": {
            "t1": 0.008 + 0.05 * x,
            "d1": 0.02 + 0.14 * x,
            "d2": 0.14 + 0.6 * x,
            "largest_t2": 0.05 + 0.7 * x,
            "triples_share": 1.4 + 9.0 * x,
            "triplet_stability": 0.3 - 0.5 * x,
            "homo_lumo_gap": 0.6 - 0.4 * x,
        },
        "uhf": {"s2_excess": x, "uhf_luno": x, "uhf_hono": 2.0 - x, "s2": x},
        "cas": {"luno": 0.03 + 0.97 * x, "hono": 1.97 - 0.97 * x, "c0_squared": 0.97 - 0.47 * x},
    }[point.level]
    return Record(
        key=point.key,
        kind="point",
        status="converged",
        stage="reference" if point.level == "uhf" else "correlate",
        scalars={"energy": float(energy), "wall_s": 1.5, "cpu_s": 1.4, "peak_memory_mb": 210.0},
        diagnostics={name: float(value) for name, value in diagnostics.items()},
        absent={"t1": "no amplitudes at this level"} if point.level == "uhf" else {},
        notes={"active_space": "2 electrons in 2 orbitals: the stretched bond"}
        if point.level == "cas"
        else {},
        inputs={"molecule": {"symbols": ["H", "F"] if point.scan == "h-f" else ["N", "N"]}},
        provenance={"physics_version": 1, "host": "somewhere", "started": "2026-01-01T00:00:00Z"},
    )


def failed(point: Planned) -> Record:
    made = record(point)
    made.status, made.reason = "unconverged", "not-converged"
    made.message = "CCSD did not converge; last energy -1.00000000 hartree"
    made.diagnostics, made.attempts = {}, 2
    return made


def fill(store: Store) -> list[Planned]:
    """Write all records but for the far end of one level, which failed, and one point that is lost."""
    planned = points()
    for point in planned:
        if point.scan == "h-f" and point.level == "ccsd-t" and point.coordinate[0] > 4.0:
            store.write(failed(point))
        elif (point.scan, point.level, point.number) != ("n-n", "cas", 7):
            store.write(record(point))
    return planned
