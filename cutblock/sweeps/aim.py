"""What the sheets of a job are fitted and measured for, and how its panels lie in their billets."""

import math
from dataclasses import dataclass

import numpy as np

from cutblock.geometry.fit import SQUARENESS
from cutblock.geometry.heights import offset_heights
from cutblock.records.job import Job
from cutblock.records.panel import Panel
from cutblock.records.shop import Conditions, Machine
from cutblock.sweeps.kerf_law import centreline_offset_mm, face_offset_mm, kerf_error_mm, kerf_share
from cutblock.sweeps.lie import Lie, lie_of
from cutblock.sweeps.validity import STEEPEST_WIRE_DEG


@dataclass(frozen=True, slots=True, kw_only=True)
class Aim:
    """What every sheet of a job is fitted and measured for."""

    tolerance_mm: float  # of the finished face
    kerf_mm: float
    face_offset_mm: float  # of the lower half's finished face above the centreline
    kerf_error_mm: float  # what kerf and coat alone leave between finished face and form
    stretch: float  # longest wire between the machine's towers by their distance
    squareness: float = SQUARENESS  # share of the tolerance that less skew is worth
    least_kerf_mm: float = 0.0  # at boundless speed
    kerf_share: float = 0.0  # of what the kerf is over the planned one, how much higher the lower half's face then lies

    @property
    def lean_deg(self) -> float:
        """How far from square the machine's wire may lean."""
        return float(np.degrees(np.arccos(min(1.0, 1.0 / self.stretch))))

    @property
    def room_mm(self) -> float:
        """What kerf and coat leave of the tolerance for the ruled fit."""
        return self.tolerance_mm - abs(self.kerf_error_mm)


def aim_of(job: Job, conditions: Conditions, tool: Machine) -> Aim:
    """Return what the sheets of a job are fitted for.

    Args:
        job: Tolerance, coat, favour and squareness.
        conditions: The kerf at the planned speed.
        tool: Its wire's stretch; the wire leans no further than 45 degrees on any machine.
    """
    return Aim(
        tolerance_mm=job.tolerance_mm,
        kerf_mm=conditions.kerf_mm,
        face_offset_mm=face_offset_mm(conditions.kerf_mm, job.coat_mm),
        kerf_error_mm=kerf_error_mm(job.favour, conditions.kerf_mm, job.coat_mm),
        stretch=min(tool.longest_wire_mm / tool.span_mm, 1.0 / math.cos(math.radians(STEEPEST_WIRE_DEG))),
        squareness=job.squareness,
        least_kerf_mm=conditions.least_kerf_mm,
        kerf_share=kerf_share(job.favour),
    )


def lies_of(job: Job, panel: Panel, conditions: Conditions, wires: str) -> list[Lie]:
    """Return how a panel lies in its billet, fitted to the form's offset for kerf and coat.

    Args:
        job: Coat, favour and margin.
        panel: The panel.
        conditions: The kerf at the planned speed.
        wires: One lie for each letter: the panel axis, "x" or "y", the wire lies along.
    """
    offset = centreline_offset_mm(job.favour, conditions.kerf_mm, job.coat_mm)
    heights = panel.heights_mm
    if offset:
        heights = offset_heights(heights, panel.length_mm, panel.width_mm, offset)
    return [lie_of(panel, heights, along, job.margin_mm) for along in wires]
