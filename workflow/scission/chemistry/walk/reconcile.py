"""Comparing all neighbours of a finished curve: aligning what is degenerate, reporting what truly crosses."""

from __future__ import annotations

from typing import Any

from .chain import SMOOTH, ChainState, Node

DEEPEST = 3
"""How often the interval of a sudden change is halved before it is reported as a crossing."""


def reconcile(state: ChainState) -> list[dict[str, Any]]:
    """Align degenerate partners along the curve and return the crossings that remain.

    Each crossing has from_key, to_key (neighbouring points of the campaign), from_angstrom, to_angstrom
    (the narrowest interval known), overlap, energy_step_hartree and what.
    """
    if state.unrestricted:
        _align(state)
    crossings = []
    for a, b in state.pairs():
        if state.good(a) and state.good(b) and state.overlap(a, b) < SMOOTH:
            narrow = _narrow(state, a, b, DEEPEST) if state.unrestricted else (a, b)
            if narrow is not None:
                crossings.append(_describe(state, *narrow))
    return crossings


def _align(state: ChainState) -> None:
    """Give every node the orientation of its neighbour nearer to the start, where that costs no energy."""
    for node, nearer in state.outward(state.start):
        if not (state.good(node) and state.good(nearer)):
            continue
        overlap, swapped = state.overlap_and_swap(nearer, node)
        if swapped:
            state.swap(node)
        if overlap < SMOOTH:
            state.solve(
                node, [{"carry": nearer.key}], choose="lowest", replace="closer", closer_to=nearer.key
            )


def _narrow(state: ChainState, a: Node, b: Node, depth: int) -> tuple[Node, Node] | None:
    """Halve the interval of a sudden change; ``None`` if the state turns out to change smoothly."""
    if depth == 0:
        return a, b
    middle = state.between(a, b)
    if not state.settled(middle):
        state.solve(middle, [{"carry": a.key}, {"carry": b.key}], choose="lowest")
    if not state.good(middle):
        return a, b
    rough = [(x, y) for x, y in ((a, middle), (middle, b)) if state.overlap(x, y) < SMOOTH]
    if not rough:
        return None
    return _narrow(state, *rough[0], depth - 1)


def _describe(state: ChainState, a: Node, b: Node) -> dict[str, Any]:
    """Return a crossing between two nodes, with a remark for the points on both sides."""
    left, right = _point_before(state, a), _point_after(state, b)
    step = state.energy(b) - state.energy(a)
    kind = "active space" if state.active else "determinant"
    words = f"the {kind} changes its state between {a.coordinate:.4f} and {b.coordinate:.4f} angstrom"
    for node in (left, right):
        state.say(node, "crossing", words)
    return {
        "from_key": left.key,
        "to_key": right.key,
        "from_angstrom": a.coordinate,
        "to_angstrom": b.coordinate,
        "overlap": state.overlap(a, b),
        "energy_step_hartree": step,
        "what": _what(state),
    }


def _what(state: ChainState) -> str:
    """Return in words what is different on the two sides."""
    if state.active:
        return "orbitals enter or leave the active space"
    if state.unrestricted:
        return "two unrestricted solutions cross; the lower one is kept on each side"
    return "the restricted determinant cannot be followed any further and changes its occupied orbitals"


def _point_before(state: ChainState, node: Node) -> Node:
    upto = state.nodes[: state.nodes.index(node) + 1]
    return next((n for n in reversed(upto) if not n.auxiliary), node)


def _point_after(state: ChainState, node: Node) -> Node:
    return next((n for n in state.nodes[state.nodes.index(node) :] if not n.auxiliary), node)
