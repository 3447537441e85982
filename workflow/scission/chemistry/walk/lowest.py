"""Taking the lowest unrestricted solution at every geometry, from several anchors and from neighbours."""

from __future__ import annotations

from typing import Any

from .chain import ChainState, Node

ALIKE = 0.98
"""Neighbours that overlap less than this try each other's solution."""

ROUNDS = 8
"""Rounds of exchange between neighbours at most; four were the most ever needed."""

_WHOLE: list[dict[str, Any]] = [{"engine": "minao"}, {"broken": True}]
"""Starts from the whole molecule; far from the equilibrium the separated fragments come on top."""


def take_lowest(state: ChainState, careful: bool = True) -> None:
    """Establish the anchors, walk outward from each, keep the lowest, then let neighbours exchange solutions.

    Without ``careful`` only what is there is carried on: the chain is a block between finished nodes.
    """
    anchors = _anchors(state) if careful else [state.nodes[0], state.nodes[-1]]
    for anchor in anchors:
        if careful and not state.settled(anchor):
            starts = _WHOLE if anchor is state.start else [*_WHOLE, {"fragments": True}]
            state.solve(anchor, starts, choose="lowest", stability=True, polish=not state.kohn_sham)
    for anchor in anchors:
        if state.good(anchor):
            _walk(state, anchor)
    _exchange(state, {n.key for n in state.nodes})
    for _ in range(ROUNDS):
        lowered = _follow_instabilities(state)
        if not lowered:
            return
        _exchange(state, lowered)


def _follow_instabilities(state: ChainState) -> set[str]:
    """Follow instabilities of the nodes that still may have one; return the keys of those that got lower.

    Each node is asked once for a solution it holds.  Kohn-Sham determinants, whose stability costs more than
    all the rest, are asked only next to a change of state, where one family of solutions ends.
    """
    rough = {n.key for a, b in state.pairs() if worth_trying(state, a, b) for n in (a, b)}
    lowered = set()
    for node in state.nodes:
        if not state.good(node) or not state.unproven(node) or (state.kohn_sham and node.key not in rough):
            continue
        before = state.energy(node)
        state.solve(node, [{"standing": True}], choose="lowest", replace="lower", stability=True)
        if state.energy(node) < before - state.least_step:
            lowered.add(node.key)
        state.prove(node)
    return lowered


def _anchors(state: ChainState) -> list[Node]:
    """Return the equilibrium, the stretched and the farthest node, each once."""
    return list({n.key: n for n in (state.start, state.stretched, state.nodes[-1])}.values())


def _walk(state: ChainState, anchor: Node) -> None:
    """Carry the anchor's solution outward on both sides, keeping at each node what is lower."""
    for node, nearer in state.outward(anchor):
        parent = nearer if state.good(nearer) else state.good_towards(node, anchor)
        if parent is None or (
            state.settled(node) and state.good(node) and not worth_trying(state, parent, node)
        ):
            continue
        state.try_from(node, parent)


def worth_trying(state: ChainState, parent: Node, node: Node) -> bool:
    """Whether a node's solution may be another one than its neighbour's."""
    return state.overlap(parent, node) < ALIKE


def _exchange(state: ChainState, changed: set[str]) -> None:
    """Let nodes try their neighbours' solutions where they differ and one has changed, until nothing gets lower."""
    for _ in range(ROUNDS):
        again: set[str] = set()
        for a, b in state.pairs():
            if a.key not in changed and b.key not in changed:
                continue
            if state.good(a) and state.good(b) and not worth_trying(state, a, b):
                continue
            again |= {
                n.key for n, other in ((b, a), (a, b)) if state.good(other) and state.try_from(n, other)
            }
        if not again:
            return
        changed = again
