"""What a plan costs in foam and machine time."""

import math
from collections.abc import Sequence

from cutblock.base.units import hours as in_hours
from cutblock.records.account import Cost, Hours
from cutblock.records.block import Block
from cutblock.records.job import Job


def count_cost(job: Job, blocks: Sequence[Block], hours: Hours, cost_bound: float | None) -> Cost:
    """Return the money a plan takes, as far as prices are given.

    An offcut without a price costs nothing: it was paid for with the block it came from.

    Args:
        job: Its currency and its price of a machine hour.
        blocks: Every block bought or taken from the shop's offcuts.
        hours: Machine time.
        cost_bound: No packing can cost less; None where that is not known.

    Returns:
        Foam is None where a block has no price, machine time where an hour has none.
    """
    prices = [0.0 if block.price is None and block.from_offcut else block.price for block in blocks]
    known = [price for price in prices if price is not None]
    foam = math.fsum(known) if len(known) == len(prices) else None
    return Cost(
        currency=job.currency,
        foam=foam,
        machine=None if job.hour_rate is None else in_hours(hours.total_s) * job.hour_rate,
        foam_bound=None if foam is None else cost_bound,
    )
