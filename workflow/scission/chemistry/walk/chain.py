"""The state of a chain while it is walked: its nodes, their records, and the tasks it can ask for."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numpy.typing import NDArray

from scission.chemistry.compare import least_step, overlap_and_swap, stability_changes
from scission.plan.identity import reference_key
from scission.records.store import Record, Store

SMOOTH = 0.9
"""Neighbours whose occupied (or active) spaces overlap less than this are not the same state for sure."""

_LEAVE_ORBITALS = ("finish", "label", "coulson_fischer")


@dataclass
class Node:
    """One geometry of the chain; auxiliary ones bridge gaps and are no points of the campaign."""

    key: str
    coordinate: float
    positions: NDArray[np.float64]
    auxiliary: bool


class ChainState:
    """Nodes of one chain in the order of the coordinate, with the records they have so far."""

    def __init__(
        self, chain: dict[str, Any], store: Store, run: Callable[[dict[str, Any]], dict[str, Any]]
    ) -> None:
        self.chain = chain
        self.store = store
        self._run = run
        self._records: dict[str, Record | None] = {}
        self._again = set(chain.get("again", ()))
        self._touched: set[str] = set()
        self._before: dict[str, float] = {}
        self._proven: dict[str, float] = {}
        self.least_step = least_step(chain["spec"])
        self._tried: set[tuple[str, ...]] = set()
        self.notes: dict[str, dict[str, str]] = {}
        self.nodes = [
            Node(n["key"], n["coordinate"], np.array(n["positions"]), n["auxiliary"]) for n in chain["nodes"]
        ]
        self.start = self.nodes[chain["start"]]
        self.stretched = self.nodes[chain["stretched"]]
        ends = (self.nodes[0], self.nodes[-1]) if chain.get("phase") == "block" else ()
        self._fixed = {n.key for n in ends if self.record(n) is not None}
        """Nodes that another block shares: they are read, never written, until the chain is reconciled."""
        for node in self.nodes:
            if self.good(node):
                self._before[node.key] = self.energy(node)

    @property
    def unrestricted(self) -> bool:
        """Whether the reference has different orbitals for different spins."""
        return self.chain["spec"]["reference"] in ("UHF", "UKS")

    @property
    def kohn_sham(self) -> bool:
        """Whether the reference is a Kohn-Sham determinant."""
        return bool(self.chain["spec"].get("functional"))

    @property
    def active(self) -> bool:
        """Whether the reference has an active space."""
        return self.chain["spec"]["reference"] == "CASSCF"

    @property
    def lowered(self) -> dict[str, float]:
        """Energies (hartree, negative) by which records that stood before the walk were lowered."""
        changes = {n.key: self.energy(n) - self._before[n.key] for n in self.nodes if n.key in self._before}
        return {key: step for key, step in changes.items() if step < -self.least_step}

    def record(self, node: Node) -> Record | None:
        """Return the node's record, or ``None``."""
        if node.key not in self._records:
            self._records[node.key] = self.store.read("reference", node.key)
        return self._records[node.key]

    def good(self, node: Node) -> bool:
        """Whether the node has a converged record."""
        record = self.record(node)
        return record is not None and record.status == "converged"

    def unproven(self, node: Node) -> bool:
        """Whether nobody has looked yet for an instability of the solution the node holds."""
        record = self.record(node)
        finished = record is not None and bool(record.diagnostics or record.absent)
        return not finished and abs(self._proven.get(node.key, np.inf) - self.energy(node)) > self.least_step

    def prove(self, node: Node) -> None:
        """Remember that the instabilities of the node's solution have been followed."""
        self._proven[node.key] = self.energy(node)

    def settled(self, node: Node) -> bool:
        """Whether the node needs no first calculation: it has a record and nobody asked for another."""
        return self.record(node) is not None and node.key not in self._again

    def energy(self, node: Node) -> float:
        """Return the node's energy, hartree; infinite where it has none."""
        record = self.record(node)
        return float(record.scalars["energy"]) if record is not None and self.good(node) else float("inf")

    def overlap(self, a: Node, b: Node) -> float:
        """Return how alike the states of two nodes are, 0 to 1, up to an exchange of spins."""
        return self.overlap_and_swap(a, b)[0]

    def overlap_and_swap(self, a: Node, b: Node) -> tuple[float, bool]:
        """Return the same and whether alpha and beta have to be exchanged for it."""
        first, second = self.record(a), self.record(b)
        if first is None or second is None or not (self.good(a) and self.good(b)):
            return 0.0, False
        return overlap_and_swap(first, second)

    def solve(self, node: Node, starts: list[dict[str, Any]], **options: Any) -> bool:
        """Compute a node from ``starts``; return whether it now has a converged record.

        ``options`` are those of :func:`scission.chemistry.establish.establish_reference`.
        """
        if node.key in self._fixed:
            return self.good(node)
        self._again.discard(node.key)
        self._task(node, {"kind": "reference", "starts": starts, **options})
        return self.good(node)

    def try_from(self, node: Node, parent: Node) -> bool:
        """Start a node from ``parent``'s solution and keep what is lower; return whether that lowered it.

        What has been tried before from the same solution onto the same one is not tried again.
        """
        before = self.energy(node)
        stamps = [record.stamp if (record := self.record(n)) is not None else "" for n in (node, parent)]
        attempt = (node.key, parent.key, *stamps)
        if attempt not in self._tried:
            self._tried.add(attempt)
            self.solve(node, [{"carry": parent.key}], choose="lowest", replace="lower")
        return self.energy(node) < before - self.least_step

    def swap(self, node: Node) -> None:
        """Exchange alpha and beta of a node's record."""
        self._task(node, {"kind": "swap"})

    def label(self) -> None:
        """Label averaged states by their overlap with the neighbour's, outward from the start."""
        if self.chain["spec"].get("states", 1) < 2 or not self.good(self.start):
            return
        self._task(self.start, {"kind": "label"})
        for node, _ in self.outward(self.start):
            nearer = self.good_towards(node, self.start)
            if self.good(node) and nearer is not None:
                self._task(node, {"kind": "label", "from": nearer.key})

    def finish(self) -> None:
        """Evaluate diagnostics of the nodes that are points and lack them or have changed."""
        for node in self.nodes:
            self._finish(node)
        self._locate_instability()

    def finish_early(self, node: Node) -> None:
        """Evaluate a node's diagnostics while the integrals of its geometry are at hand.

        Should its state change later they are evaluated again; averaged states wait for their labels.
        """
        if self.chain["spec"].get("states", 1) < 2 and node.key not in self._fixed:
            self._finish(node)

    def _finish(self, node: Node) -> None:
        record = self.record(node)
        if node.auxiliary or record is None or not self.good(node):
            return
        evaluated = bool(record.diagnostics or record.absent)
        if not evaluated or node.key in self._touched or node.key in self.notes:
            self._task(node, {"kind": "finish", "notes": self.notes.get(node.key, {})})
            self._touched.discard(node.key)

    def _locate_instability(self) -> None:
        """Find the length between two points where the triplet stability eigenvalue passes through zero."""
        points = [n for n in self.nodes if not n.auxiliary and self.good(n)]
        for a, b in pairwise(points):
            first, second = self.record(a), self.record(b)
            if first is None or second is None or "coulson_fischer" in first.scalars:
                continue
            if stability_changes(first, second):
                lengths = [a.coordinate, b.coordinate]
                partner = {"partner": b.key, "partner_positions": b.positions.tolist()}
                self._task(a, {"kind": "coulson_fischer", "coordinates": lengths, **partner})

    def outward(self, origin: Node) -> Iterator[tuple[Node, Node]]:
        """Yield (node, its neighbour nearer to ``origin``) on both sides, nearest first."""
        at = self.nodes.index(origin)
        ordered = list(self.nodes)
        for i in range(at + 1, len(ordered)):
            yield ordered[i], ordered[i - 1]
        for i in range(at - 1, -1, -1):
            yield ordered[i], ordered[i + 1]

    def pairs(self) -> list[tuple[Node, Node]]:
        """Return neighbouring nodes in the order of the coordinate."""
        return list(zip(self.nodes, self.nodes[1:], strict=False))

    def good_towards(self, node: Node, origin: Node) -> Node | None:
        """Return the nearest node with a converged record on the way from ``node`` to ``origin``, else beyond."""
        at, goal = self.nodes.index(node), self.nodes.index(origin)
        way = self.nodes[at + 1 :] if goal > at else self.nodes[:at][::-1]
        return next((n for n in way if self.good(n)), None)

    def between(self, a: Node, b: Node) -> Node:
        """Add an auxiliary node half way between two neighbours and return it."""
        positions = (a.positions + b.positions) / 2.0
        chain = self.chain
        key = reference_key(chain["molecule"], chain["spec"], chain["bonds"], positions)
        node = Node(key, (a.coordinate + b.coordinate) / 2.0, positions, True)
        self.nodes.insert(max(self.nodes.index(a), self.nodes.index(b)), node)
        return node

    def say(self, node: Node, subject: str, words: str) -> None:
        """Keep a remark for the node's record."""
        self.notes.setdefault(node.key, {})[subject] = words

    def _task(self, node: Node, what: dict[str, Any]) -> None:
        chain = self.chain
        common = {k: chain[k] for k in ("molecule", "spec", "bonds", "fragments")}
        task = {"key": node.key, "positions": node.positions.tolist(), **common, **what}
        old = self._records.get(node.key)
        self._run(task)
        self._records.pop(node.key, None)
        new = self.record(node)
        changed = old is None or new is None or new.stamp != old.stamp or what["kind"] == "swap"
        if what["kind"] not in _LEAVE_ORBITALS and changed:
            self._touched.add(node.key)
