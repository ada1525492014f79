"""Where the kerf and the coat put the finished faces, and so what the wire's centreline is fitted to.

A round wire of kerf w leaves the lower half's face w/2 below its centreline sheet, square to it; a coat c brings the
finished face to -w/2 + c. Favouring a half moves the centreline so that this half's finished face meets the form.
"""

from cutblock.records.words import Favour


def face_offset_mm(kerf_mm: float, coat_mm: float) -> float:
    """Return how far the lower half's finished face lies above the centreline sheet."""
    return coat_mm - kerf_mm / 2.0


def centreline_offset_mm(favour: Favour, kerf_mm: float, coat_mm: float) -> float:
    """Return how far above the form the centreline is fitted."""
    offset = kerf_mm / 2.0 - coat_mm
    return {Favour.LOWER: offset, Favour.UPPER: -offset, Favour.SHARE: 0.0}[favour]


def kerf_error_mm(favour: Favour, kerf_mm: float, coat_mm: float) -> float:
    """Return how far above the form kerf and coat alone leave the lower half's finished face."""
    return centreline_offset_mm(favour, kerf_mm, coat_mm) + face_offset_mm(kerf_mm, coat_mm)


def kerf_share(favour: Favour) -> float:
    """Return how much higher the lower half's finished face lies by each mm that the kerf is over the planned one.

    The centreline is fitted again for the settled kerf, so that the favoured half still meets the form; where the kerf
    is shared it stays.
    """
    return {Favour.LOWER: 0.0, Favour.UPPER: -1.0, Favour.SHARE: -0.5}[favour]
