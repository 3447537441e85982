"""Taking the lowest unrestricted solution at every geometry, from several anchors and from neighbours."""

from __future__ import annotations

from typing import Any

from .chain import LOWER, ChainState, Node

ALIKE = 0.98
"""Neighbours that overlap less than this try each other's solution."""

ROUNDS = 8
"""Rounds of exchange between neighbours at most; four were the most ever needed."""

_CAREFUL: list[dict[str, Any]] = [{"engine": "minao"}, {"broken": True}, {"fragments": True}]


def take_lowest(state: ChainState, careful: bool = True) -> None:
    """Establish the anchors, walk outward from each, keep the lowest, then let neighbours exchange solutions.

    Without ``careful`` only what is there is carried on: the chain is a block between finished nodes.
    """
    anchors = _anchors(state) if careful else [state.nodes[0], state.nodes[-1]]
    for anchor in anchors:
        if careful and not state.settled(anchor):
            state.solve(anchor, _CAREFUL, choose="lowest", stability=True)
    for anchor in anchors:
        if state.good(anchor):
            _walk(state, anchor)
    _exchange(state)


def _anchors(state: ChainState) -> list[Node]:
    """Return the equilibrium, the stretched and the farthest node, each once."""
    return list({n.key: n for n in (state.start, state.stretched, state.nodes[-1])}.values())


def _walk(state: ChainState, anchor: Node) -> None:
    """Carry the anchor's solution outward on both sides, keeping at each node what is lower."""
    for node, nearer in state.outward(anchor):
        parent = nearer if state.good(nearer) else state.good_towards(node, anchor)
        if parent is None or (state.settled(node) and state.good(node) and not worth_trying(state, parent, node)):
            continue
        state.solve(node, [{"carry": parent.key}], choose="lowest", replace="lower")


def worth_trying(state: ChainState, parent: Node, node: Node) -> bool:
    """Whether a node's solution may be another one than its neighbour's."""
    return state.overlap(parent, node) < ALIKE


def _exchange(state: ChainState) -> None:
    """Let every node try its neighbours' solutions where they differ, until nothing gets lower."""
    changed = {n.key for n in state.nodes}
    for _ in range(ROUNDS):
        again: set[str] = set()
        for a, b in state.pairs():
            if a.key not in changed and b.key not in changed:
                continue
            if state.good(a) and state.good(b) and not worth_trying(state, a, b):
                continue
            again |= {n.key for n, other in ((b, a), (a, b)) if _try_neighbour(state, n, other)}
        if not again:
            return
        changed = again


def _try_neighbour(state: ChainState, node: Node, neighbour: Node) -> bool:
    """Start a node from its neighbour; return whether that lowered it."""
    if not state.good(neighbour):
        return False
    before = state.energy(node)
    state.solve(node, [{"carry": neighbour.key}], choose="lowest", replace="lower")
    return state.energy(node) < before - LOWER
