"""Reference chains: which references are established together, and where a chain starts.

A reference is carried from geometry to geometry, so neighbours must be close.  Where the grid of a scan is
coarse, or lies far from the equilibrium, auxiliary nodes bridge the gaps; they are no points of the campaign.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from itertools import pairwise
from typing import Any

import numpy as np

from scission.campaign import Molecule, Scan
from scission.campaign.model import PICTURES
from scission.geometry import ScanPath, equilibrium_guess_angstrom, path_at

from .identity import canonical, reference_keys
from .types import Chain, Node

STRETCHED = 2.0
"""Where an active space is chosen, in units of the expected equilibrium length: bond orbitals are well
separated from the rest there, and fragments still feel each other, which fixes their orientation."""

_NEAR = (0.85, 1.2)
_WIDEST_RATIO = ((3.0, 1.35), (np.inf, 2.0))
"""Largest ratio of neighbouring lengths, up to so many equilibrium lengths: overlaps of carried orbitals
stay near one with these (own measurement on the demo's molecules)."""


def molecule_facts(molecule: Molecule) -> dict[str, Any]:
    """Return what identity and chemistry need to know of a molecule besides its geometry."""
    return {
        "symbols": list(molecule.symbols),
        "charge": molecule.charge,
        "multiplicity": molecule.multiplicity,
    }


def build_chain(name: str, molecule: Molecule, scan: Scan, path: ScanPath, spec: dict[str, Any]) -> Chain:
    """Return the chain that establishes the references of ``spec`` along ``path``.

    Lengths of the nodes are in angstrom, in increasing order.
    """
    facts = molecule_facts(molecule)
    grid = [float(v) for v in path.values[:, 0]]
    equilibrium = equilibrium_guess_angstrom(molecule, scan)
    extra = auxiliary_lengths(grid, equilibrium, need_stretched=spec["reference"] == "CASSCF")
    if spec["reference"] in PICTURES:  # each geometry by itself: nothing is carried
        extra = []
    nodes = _nodes(facts, spec, path, auxiliary=False)
    if extra:
        nodes += _nodes(facts, spec, path_at(molecule, scan, extra), auxiliary=True)
    chain = Chain(name, facts, spec, path.bonds, path.fragments, tuple(nodes), 0, 0)
    return _ordered(chain, equilibrium)


def auxiliary_lengths(grid: Sequence[float], equilibrium: float, need_stretched: bool) -> list[float]:
    """Return the lengths (angstrom) to add to ``grid`` so that no step of a chain is too wide.

    The expected equilibrium is added when no grid point lies near it, the stretched bond when it is needed
    and the grid has no point there; gaps are then filled in equal ratios.
    """
    lengths = sorted(grid)
    low, high = _NEAR
    added: list[float] = []
    if not any(low * equilibrium <= x <= high * equilibrium for x in lengths):
        added.append(equilibrium)
    target = STRETCHED * equilibrium
    if need_stretched and not any(0.9 * target <= x <= 1.25 * target for x in lengths):
        added.append(target)
    knots = sorted([*lengths, *added])
    for a, b in pairwise(knots):
        added += _fill(a, b, equilibrium)
    return [round(x, 6) for x in sorted(added)]


def merge_chains(chains: Iterable[Chain]) -> list[Chain]:
    """Merge chains of the same molecule, reference and coordinate (scans that differ in their grids only).

    A grid point takes the place of an auxiliary node of the same key.
    """
    groups: dict[str, list[Chain]] = {}
    for chain in chains:
        identity = canonical([chain.molecule, chain.spec, chain.bonds, chain.fragments, _shape(chain)])
        groups.setdefault(identity, []).append(chain)
    return [_merged(group) if len(group) > 1 else group[0] for group in groups.values()]


def _merged(group: Sequence[Chain]) -> Chain:
    first = group[0]
    nodes = {n.key: n for chain in group for n in chain.nodes if n.auxiliary}
    nodes |= {n.key: n for chain in group for n in chain.nodes if not n.auxiliary}
    together = replace(first, name="+".join(chain.name for chain in group), nodes=tuple(nodes.values()))
    return _ordered(together, first.nodes[first.start].coordinate)


def _nodes(facts: dict[str, Any], spec: dict[str, Any], path: ScanPath, auxiliary: bool) -> list[Node]:
    keys = reference_keys(facts, spec, path.bonds, path.positions)
    lengths = path.values[:, 0].tolist()
    return [Node(*item, auxiliary) for item in zip(keys, lengths, path.positions, strict=True)]


def _shape(chain: Chain) -> list[Any]:
    """Return what a rigid stretch leaves as it is: each fragment's positions from its first atom, bohr.

    Isomers and conformers with the same atoms and bond differ in nothing else.
    """
    positions = chain.nodes[0].positions
    parts = [positions[list(f)] - positions[f[0]] for f in chain.fragments if f]
    return [(np.round(part, 6) + 0.0).tolist() for part in parts]


def _ordered(chain: Chain, equilibrium: float) -> Chain:
    nodes = tuple(sorted(chain.nodes, key=lambda n: n.coordinate))
    start, stretched = (
        min(range(len(nodes)), key=lambda i: abs(nodes[i].coordinate - x))
        for x in (equilibrium, STRETCHED * equilibrium)
    )
    return replace(chain, nodes=nodes, start=start, stretched=stretched)


def _fill(a: float, b: float, equilibrium: float) -> list[float]:
    widest = next(ratio for limit, ratio in _WIDEST_RATIO if a < limit * equilibrium)
    parts = int(np.ceil(np.log(b / a) / np.log(widest) - 1e-9))
    return [float(a * (b / a) ** (k / parts)) for k in range(1, parts)]
