"""What every source of a face needs: lengths that become u and v, and the surface as a record."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.geometry.patch import SplineSurface
from cutblock.records.form import Patch
from cutblock.records.words import Layup


def recorded(surface: SplineSurface) -> Patch:
    """Return a spline surface as a record."""
    return Patch(**surface._asdict())


def plan_lengths(steps: Floats, layup: Layup) -> Floats:
    """Return how long (n, 3) steps are: in plan on the bed, where panels are measured in plan, else in space.

    On the bed a set of steps of which one has no length in plan is measured in space; a panel there is too steep, and
    is refused where its place is known.
    """
    if layup is Layup.BED:
        plan: Floats = np.hypot(steps[:, 0], steps[:, 1])
        if plan.min() > 1e-6:
            return plan
    space: Floats = np.sqrt((steps**2).sum(axis=1))
    return space
