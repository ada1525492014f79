"""Sweeps that a machine reaches only in a clamping of their own.

Packing leaves a billet in the clamp in which it was cut free, which saves a clamping. A steep sweep wants its billet on
a stand, and with the rest of a tall part still beneath or above it there may be no place that does for all its cuts.
"""

from collections.abc import Sequence
from dataclasses import replace

from cutblock.machinecode.passes import Sources, plan_sources
from cutblock.machinecode.programs import block_troubles
from cutblock.records.block import Block, Cut
from cutblock.records.plan import Plan
from cutblock.records.words import CutKind


def split_setups(plan: Plan) -> tuple[Block, ...]:
    """Return the blocks of a plan, sweeps out of the machine's reach in a clamping of their own where that mends it.

    Args:
        plan: With its blocks packed; the most set-ups its job allows a block are kept.
    """
    sources = plan_sources(plan)
    return tuple(_split(plan, block, sources) for block in plan.blocks)


def _split(plan: Plan, block: Block, sources: Sources) -> Block:
    troubled = block_troubles(plan, block, sources)
    n_left = len(troubled)
    for setup in sorted(troubled, reverse=True):  # from the last, so that those before keep their numbers
        apart = replace(block, cuts=_apart(block.cuts, setup))
        if plan.job.most_setups is not None and apart.cuts[-1].setup > plan.job.most_setups:
            break
        n_then = len(block_troubles(plan, apart, sources))
        if n_then < n_left:
            block, n_left = apart, n_then
    return block


def _apart(cuts: Sequence[Cut], setup: int) -> tuple[Cut, ...]:
    """Return cuts with every sweep of one clamping in one of its own, the clamping's other cuts before them."""
    ordered = sorted(cuts, key=lambda cut: cut.order)
    own = [cut for cut in ordered if cut.setup == setup]
    n_more = 0
    result = []
    for cut in ordered:
        if cut.setup == setup and cut.kind is CutKind.SWEEP:
            n_more += cut is not own[0]
        result.append(replace(cut, setup=cut.setup + n_more) if cut.setup >= setup else cut)
    return tuple(result)
