"""Pure functions for the hot wire: kerf, speed window, electrics and bow; SI units."""

from typing import TYPE_CHECKING

from cutblock.base.lazy import lazy_names

if TYPE_CHECKING:
    from cutblock.wire.kerf import kerf_rate
    from cutblock.wire.speed import speed_window

__all__ = ["kerf_rate", "speed_window"]

__getattr__ = lazy_names(__name__, {"kerf_rate": "cutblock.wire.kerf", "speed_window": "cutblock.wire.speed"})
