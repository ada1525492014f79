"""The deviation maps of finished faces, for tests that need nothing else of the step that makes them."""

from kit.sample import sample_conditions

from cutblock.base.progress import silent
from cutblock.sweeps.maps import settle


def maps_of(job, panels, sweeps, progress=silent, **changes):
    """Return one map for each panel that has a mould, at the sample conditions with some changed."""
    return settle(job, panels, sweeps, sample_conditions(**changes), progress)[0]
