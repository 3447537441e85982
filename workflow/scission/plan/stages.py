"""Cutting a costly chain into three stages, so that its subtrees run in parallel and no more than twice wait.

Spine: the anchors and every so-manieth node, carried in sequence.  Blocks: the nodes between neighbours of the
spine, each block by itself.  Reconcile: all nodes are compared, and what differs is mended.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

from .types import Chain

FEWEST_NODES = 12
"""Shorter chains are not worth cutting: nearly all of them would be spine."""

_BLOCKS = 8
"""Blocks a chain is cut into at most; more only lengthens the spine, which runs in sequence."""


@dataclass(frozen=True)
class Stage:
    """A part of a chain that one job walks: its phase and the nodes it may touch."""

    phase: str
    chain: Chain


def cut(chain: Chain, careful: bool) -> tuple[Stage, list[Stage]]:
    """Return spine and blocks of a chain; the whole of it is the last stage.

    ``careful`` adds the stretched and the last node to the spine, where lowest solutions are searched.
    """
    last = len(chain.nodes) - 1
    step = max(2, -(-last // _BLOCKS))
    wanted = {0, last, chain.start, *range(chain.start % step, last + 1, step)}
    wanted |= {chain.stretched} if careful else set()
    knots = sorted(wanted)
    spine = Stage("spine", _part(chain, knots))
    blocks = [Stage("block", _part(chain, list(range(a, b + 1)))) for a, b in pairwise(knots) if b > a + 1]
    return spine, blocks


def _part(chain: Chain, indices: list[int]) -> Chain:
    """Return the chain of some of its nodes; start and stretched move to the nearest of them."""
    start, stretched = (
        min(range(len(indices)), key=lambda i: abs(indices[i] - wanted))
        for wanted in (chain.start, chain.stretched)
    )
    nodes = tuple(chain.nodes[i] for i in indices)
    return replace(chain, nodes=nodes, start=start, stretched=stretched)
