"""Calculations as the program makes them, in one process: tasks by hand, and whole plans."""

from collections import defaultdict
from pathlib import Path

import numpy as np
import pyscf.lib
import yaml
from pyscf.data.elements import chemcore
from scission.campaign import load_campaign
from scission.chemistry.casscf import finish_casscf
from scission.chemistry.correlate import METHODS, prepared_field
from scission.chemistry.molecule import build_mole
from scission.chemistry.solutions import solution_of_field
from scission.chemistry.tasks import run_task
from scission.chemistry.walk import walk_chain
from scission.plan import make_plan
from scission.records.store import Store
from scission.units import ANGSTROM_IN_BOHR

pyscf.lib.num_threads(1)

CLOSED = ({"engine": "minao"}, {"engine": "atom"})
BROKEN = ({"engine": "minao"}, {"broken": True}, {"fragments": True})
SELECT = ({"select": True},)


def diatomic(a, b, r):
    """Two atoms ``r`` bohr apart along z: symbols and positions in bohr."""
    return [a, b], [[0.0, 0.0, 0.0], [0.0, 0.0, r]]


def angstrom(*positions):
    """Positions given in angstrom, in bohr."""
    return (np.array(positions) * ANGSTROM_IN_BOHR).tolist()


def task(key, symbols, positions, reference="RHF", basis="cc-pvdz", **more):
    """The task that establishes a reference; ``more`` are charge, multiplicity, active_space, starts ..."""
    spec = {
        "reference": reference,
        "functional": more.get("functional"),
        "basis": basis if isinstance(basis, dict) else dict.fromkeys(symbols, basis),
        "follow": "anchor",
    }
    if reference == "CASSCF":
        spec |= {"active_space": more.get("active_space", "auto"), "states": more.get("states", 1)}
    starts = SELECT if reference == "CASSCF" else BROKEN if reference in ("UHF", "UKS") else CLOSED
    two = len(symbols) > 1
    return {
        "kind": "reference",
        "key": key,
        "molecule": {
            "symbols": list(symbols),
            "charge": more.get("charge", 0),
            "multiplicity": more.get("multiplicity", 1),
        },
        "positions": positions,
        "spec": spec,
        "bonds": more.get("bonds", [[0, 1]] if two else []),
        "fragments": more.get("fragments", [[0], list(range(1, len(symbols)))] if two else [[0]]),
        "starts": list(more.get("starts", starts)),
        "choose": "lowest",
        "stability": True,
        "polish": reference == "UHF",
    }


class Bench:
    """A folder of records and the calculations that fill it."""

    def __init__(self, folder: Path) -> None:
        self.store = Store(folder)
        self._made = 0

    def compute(self, symbols, positions, reference="RHF", correlation="none", frozen_core=False, **more):
        """The finished record of one calculation: of the reference, or of the correlation upon it."""
        self._made += 1
        what = task(f"r{self._made:04d}", symbols, positions, reference, **more)
        self.run(what)
        if self.store.read("reference", what["key"]).status == "converged":
            self.run({**what, "kind": "finish"})
        if correlation == "none":
            return self.store.read("reference", what["key"])
        return self.correlate(what, correlation, frozen_core)

    def correlate(self, what, correlation, frozen_core=False):
        """The record of a correlation method on the reference that the task ``what`` has established."""
        self._made += 1
        more = {"correlation": correlation, "frozen_core": frozen_core, "reference_key": what["key"]}
        return self.run({**what, **more, "kind": "correlate", "key": f"p{self._made:04d}"}, "point")

    def solution(self, symbols, positions, reference="RHF", correlation="none", frozen_core=False, **more):
        """The same as plain arrays: the ``Solution`` that records are made of."""
        record = self.compute(symbols, positions, reference, **more)
        what = task(record.key, symbols, positions, reference, **more) | {"correlation": correlation}
        if reference == "CASSCF" and correlation == "none":
            return finish_casscf(what, record)
        mole = build_mole(what["molecule"], what["spec"]["basis"], np.array(positions))
        field = prepared_field(what, mole, record)
        if correlation == "none":
            return solution_of_field(field, what["spec"], diagnose=True)
        frozen = chemcore(mole) if frozen_core else 0
        solution = METHODS[correlation](what, field, record, frozen, self.store)
        solution.correlation = correlation
        return solution

    def run(self, what, kind="reference"):
        """Run one task and give its record."""
        run_task(what, self.store)
        return self.store.read(kind, what["key"])

    def energy(self, *args, **more):
        """The energy (hartree) of ``compute``, which must have converged."""
        record = self.compute(*args, **more)
        assert record.status == "converged", record.message
        return record.scalars["energy"]


def campaign_of(folder, molecule, levels, bond, lengths, **more):
    """A campaign of one scan ``s`` of one molecule ``m``, through a file.

    ``molecule`` holds atoms (lines, angstrom), charge and multiplicity; ``more`` goes to the campaign's top.
    """
    data = {
        "campaign": "test",
        "molecules": {"m": {"charge": 0, "multiplicity": 1, **molecule}},
        "levels": levels,
        "scans": {
            "s": {"molecule": "m", "levels": list(levels), "stretch": {"bond": bond, "lengths": lengths}}
        },
        **more,
    }
    folder.mkdir(parents=True, exist_ok=True)
    file = folder / "campaign.yaml"
    file.write_text(yaml.safe_dump(data, sort_keys=False))
    return load_campaign(file)


def run_plan(campaign, store):
    """Walk every chain and compute every point of a campaign; give the crossings that were found."""
    crossings = []
    for chain in chains(campaign):
        crossings += walk_chain(chain, store, lambda what: run_task(what, store))["crossings"]
    for job in make_plan(campaign).jobs:
        if job.stage == "correlate":
            for point in job.payload["points"]:
                run_task(point, store)
    return crossings


def chains(campaign):
    """The chains of a campaign's plan, as a job of references is given them."""
    return [c for job in make_plan(campaign).jobs if job.stage == "reference" for c in job.payload["chains"]]


def curves(campaign, store):
    """The records of a campaign that has run: level to (length in angstrom, record), in the scan's order."""
    found = defaultdict(list)
    for p in make_plan(campaign).points:
        correlated = campaign.levels[p.level].correlation != "none"
        record = store.read("point", p.key) if correlated else store.read("reference", p.reference_key)
        found[p.level].append((p.coordinate[0], record))
    return dict(found)


def energies(campaign, store):
    """Level to the energies (n,) of its points, hartree; NaN where one did not converge."""
    return {
        level: np.array([r.scalars["energy"] if r and r.status == "converged" else np.nan for _, r in points])
        for level, points in curves(campaign, store).items()
    }
