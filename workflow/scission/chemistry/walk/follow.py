"""Following one state from an anchor: restricted determinants and active spaces."""

from __future__ import annotations

from typing import Any

from .chain import SMOOTH, ChainState, Node

DEEPEST = 4
"""How often an interval is halved before a change of state in it counts as sudden."""

_LAST_RESORTS: tuple[dict[str, Any], ...] = (
    {"remedy": "level-shift"},
    {"remedy": "damping"},
    {"remedy": "second-order"},
)


def follow_from_anchor(state: ChainState) -> None:
    """Establish the anchor with care, then carry its state outward, halving steps where the state changes."""
    anchor = state.stretched if state.active else state.start
    if not state.settled(anchor):
        _establish(state, anchor)
        state.finish_early(anchor)
    for node, _ in list(state.outward(anchor)):
        if not state.settled(node):
            _carry(state, node, anchor)
            state.finish_early(node)
    _pursue(state)


def _pursue(state: ChainState) -> None:
    """Follow the state of the equilibrium to where finished nodes left it.

    An active space is chosen at the stretched bond, and blocks of a long chain start from its spine, but the
    curve belongs to the state at the equilibrium; what departs from it is computed again from this side.
    """
    for node, _ in list(state.outward(state.start)):
        parent = state.good_towards(node, state.start)
        if parent is not None and state.good(node) and state.overlap(parent, node) < SMOOTH:
            before = state.overlap(parent, node)
            state.solve(
                node, [{"carry": parent.key}], choose="first", replace="closer_state", closer_to=parent.key
            )
            if state.good(node) and before < state.overlap(parent, node) < SMOOTH:
                _approach(state, parent, node, DEEPEST)


def _establish(state: ChainState, anchor: Node) -> None:
    if state.active:
        starts: list[dict[str, Any]] = [{"select": True}]
    elif state.unrestricted:
        starts = [{"engine": "minao"}, {"engine": "atom"}, {"broken": True}, {"fragments": True}]
    else:
        starts = [{"engine": "minao"}, {"engine": "atom"}, {"engine": "huckel"}]
    if not state.solve(anchor, starts, choose="lowest", stability=True):
        for remedy in _LAST_RESORTS:
            if state.solve(anchor, starts[:1], choose="first", stability=True, **remedy):
                return


def _carry(state: ChainState, node: Node, anchor: Node) -> None:
    """Compute a node from the nearest finished one on the anchor's side; mend it where the state changed."""
    parent = state.good_towards(node, anchor)
    if parent is None:
        _establish(state, node)
        return
    state.solve(node, [{"carry": parent.key}], choose="first")
    if not state.good(node):
        _insist(state, node, parent)
    if state.good(node) and state.overlap(parent, node) < SMOOTH:
        _approach(state, parent, node, DEEPEST)


def _insist(state: ChainState, node: Node, parent: Node) -> None:
    """Try the remedies one after another on a node that did not converge."""
    for remedy in _LAST_RESORTS:
        if state.solve(node, [{"carry": parent.key}], choose="first", replace="lower", **remedy):
            return
    if not state.active:
        state.solve(node, [{"engine": "minao"}], choose="first", replace="lower")


def _approach(state: ChainState, parent: Node, node: Node, depth: int) -> None:
    """Go from ``parent`` to ``node`` in smaller steps, so that the state cannot jump unnoticed."""
    if depth == 0:
        return
    middle = state.between(parent, node)
    if not state.settled(middle):
        state.solve(middle, [{"carry": parent.key}], choose="first")
    if not state.good(middle):
        return
    if state.overlap(parent, middle) < SMOOTH:
        _approach(state, parent, middle, depth - 1)
    state.solve(node, [{"carry": middle.key}], choose="first")
    if state.good(node) and state.overlap(middle, node) < SMOOTH:
        _approach(state, middle, node, depth - 1)
