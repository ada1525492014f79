"""Pure functions on arrays for surfaces, ruled sweeps and solids; mm and rad."""

from typing import TYPE_CHECKING

from cutblock.base.lazy import lazy_names

if TYPE_CHECKING:
    from cutblock.geometry.fit import fit_ruled
    from cutblock.geometry.solids import split_billet
    from cutblock.geometry.volume import volume_below

__all__ = ["fit_ruled", "split_billet", "volume_below"]

__getattr__ = lazy_names(
    __name__,
    {
        "fit_ruled": "cutblock.geometry.fit",
        "split_billet": "cutblock.geometry.solids",
        "volume_below": "cutblock.geometry.volume",
    },
)
