"""Walking a scan: references that are computed one from another, so that the curve is one curve.

``walk_chain`` drives the calculations of a chain through ``run`` and compares records; it does no chemistry
itself, so that every calculation can be supervised in a process of its own.

Two policies (measured on many molecules, see the documentation of the method):

* ``anchor``: restricted references and active spaces follow the state they have where they start, because
  the lowest restricted solution of a stretched bond is often a spatially broken one.
* ``lowest``: unrestricted determinants take the lowest solution found from several well prepared anchors
  and from their neighbours, then degenerate partners are aligned so that the state changes smoothly.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from scission.campaign.model import PICTURES
from scission.records.store import Store

from .chain import ChainState
from .follow import follow_from_anchor
from .lowest import take_lowest
from .reconcile import reconcile

Run = Callable[[dict[str, Any]], dict[str, Any]]


def walk_chain(chain: dict[str, Any], store: Store, run: Run) -> dict[str, Any]:
    """Establish every reference of ``chain`` and return what there is to say about the whole curve.

    Args:
        chain: molecule, spec, bonds, fragments, nodes (key, coordinate in angstrom, positions in bohr,
            auxiliary), start and stretched as in :class:`scission.plan.Chain`; ``again`` lists keys whose
            calculation was asked for again; ``phase`` is ``whole``, or ``spine`` or ``block`` for a part of
            a long chain that another job completes.
        store: where the records lie.
        run: runs one task and returns its summary; a task that fails leaves a failed record.

    Returns:
        name, keys, crossings (see :mod:`.reconcile`) and, by key, energies that were lowered.
    """
    state = ChainState(chain, store, run)
    if chain["spec"]["reference"] in PICTURES:
        return _evaluate(state)
    phase = chain.get("phase", "whole")
    if chain["spec"]["follow"] == "lowest":
        take_lowest(state, careful=phase != "block")
    else:
        follow_from_anchor(state)
    if phase != "whole":
        return {"name": chain["name"], "keys": [], "crossings": [], "lowered": {}}
    crossings = reconcile(state)
    state.label()
    state.finish()
    return {
        "name": chain["name"],
        "keys": [n.key for n in state.nodes if not n.auxiliary],
        "crossings": crossings,
        "lowered": state.lowered,
    }


def _evaluate(state: ChainState) -> dict[str, Any]:
    """Compute every node by itself: the pictures of a bond have no state that could be lost on the way."""
    points = [node for node in state.nodes if not node.auxiliary]
    for node in points:
        if not state.settled(node):
            state.solve(node, [])
    state.finish()
    return {"name": state.chain["name"], "keys": [n.key for n in points], "crossings": [], "lowered": {}}


__all__ = ["walk_chain"]
