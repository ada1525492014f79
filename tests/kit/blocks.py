"""Blocks full of billets, for pictures."""

from dataclasses import replace

from kit.sample import sample_block, sample_plan

from cutblock.records.block import Offcut, PlacedBillet


def stacked_block(n_x=5, n_y=2, n_z=3):
    """n_x x n_y x n_z billets in a block, every second one a little lower, and their upper halves."""
    billets = tuple(
        PlacedBillet(
            sweep=f"SM-T-{'ABCDEFGHJK'[z * n_y + y]}{x + 1:02d}",
            at_mm=(15.0 + x * 2470.0 / n_x, 15.0 + y * 1220.0 / n_y, 15.0 + z * 660.0 / n_z),
            size_mm=(2470.0 / n_x - 2.0, 1220.0 / n_y - 2.0, 660.0 / n_z - 2.0 - 3.0 * (x % 2)),
            turned=bool(x % 2),
        )
        for z in range(n_z)
        for y in range(n_y)
        for x in range(n_x)
    )
    block = replace(
        sample_block(), billets=billets, offcuts=(Offcut(size_mm=(300.0, 300.0, 8.0), at_mm=(15, 15, 676)),)
    )
    upper = sample_plan().pieces[1]
    return block, tuple(replace(upper, sweep=billet.sweep) for billet in billets)
