"""What a tag says, gathered for one piece before anything is placed."""

from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np

from cutblock.geometry.outline import Rings, area_of_rings, parts_of, rings_of
from cutblock.geometry.outline import box as plan_box
from cutblock.records.block import Block
from cutblock.records.panel import Panel
from cutblock.records.piece import Piece, persons_to_lift
from cutblock.records.sweep import Serving, Sweep
from cutblock.records.words import Duty, Half

_SAME_EDGE_MM = 1.0  # an outline that passes the billet's edge by less ends there
_LONGEST_TITLE = 64  # letters; a longer one would print too small to read

BILLET_EDGES = {"start": (-1.0, 0.0, 0.0), "end": (1.0, 0.0, 0.0), "near": (0.0, -1.0, 0.0), "far": (0.0, 1.0, 0.0)}
_PANEL_SIDES = (("west", 0, -1.0), ("east", 0, 1.0), ("south", 1, -1.0), ("north", 1, 1.0))


class EdgeFact(NamedTuple):
    """One upright face of the billet: the side of the panel it lies on, and the panels that meet it there."""

    side: str  # "N", "E", "S" or "W" of the panel in plan; empty where the half serves no panel
    neighbours: tuple[str, ...]
    goes_on: bool = False  # the panel reaches beyond the billet here, into the next strip

    @property
    def words(self) -> str:
        """What the workshop reads at the edge."""
        return "next strip" if self.goes_on else " ".join([self.side, *self.neighbours]).strip()


class TagFacts(NamedTuple):
    """Everything one tag says."""

    piece: Piece
    sweep: Sweep
    title: str
    revision: str
    grade: str
    cut_order: int | None  # of the piece's sweep in its block
    edges: Mapping[str, EdgeFact]  # by the names of BILLET_EDGES
    outline: Rings  # rings (n, 2) of the panel in the billet's plan; empty where unknown
    strip: str  # "strip 1 of 2" of a panel cut in strips, else empty

    @property
    def n_persons(self) -> int:
        """How many people lift it."""
        return persons_to_lift(self.piece.mass_kg, max(self.sweep.length_mm, self.sweep.width_mm))

    @property
    def use(self) -> str:
        """What the piece is for."""
        words = self.piece.duty.value.upper()
        if self.piece.duty is Duty.SURPLUS:
            return f"{words}, no use yet"
        if self.piece.panel is None:
            return f"{words}: {self.piece.filler}" if self.piece.filler else words
        return f"{words} for panel {self.piece.panel}{f', {self.strip}' if self.strip else ''}"

    @property
    def manner(self) -> str:
        """Which half it is and how it lies in use."""
        if self.piece.half is Half.LOWER:
            return "LOWER half (L), face up as cut"
        if self.piece.duty in {Duty.MOULD, Duty.CRADLE}:
            return "UPPER half (U), turn over: face up"
        return "UPPER half (U), face down as cut" if self.piece.duty is Duty.COUNTER_MOULD else "UPPER half (U)"

    @property
    def block(self) -> str:
        """Where the piece comes from."""
        if self.piece.block is None:
            return "none"
        return self.piece.block if self.cut_order is None else f"{self.piece.block}, cut {self.cut_order}"

    @property
    def mass(self) -> str:
        """The mass as people read it."""
        return f"{self.piece.mass_kg:.1f} kg"

    @property
    def billet(self) -> str:
        """The size of the billet as people read it."""
        sweep = self.sweep
        return f"{sweep.length_mm:.0f} × {sweep.width_mm:.0f} × {sweep.height_mm:.0f} mm"


def gather_facts(
    title: str, revision: str, piece: Piece, sweep: Sweep, block: Block | None, panels: Mapping[str, Panel]
) -> TagFacts:
    """Return what the tag of a piece says.

    Args:
        title: Of the job; shortened where it is very long.
        revision: Of the job.
        piece: The piece.
        sweep: The piece's sweep.
        block: The block the sweep's billet comes from, if it has one.
        panels: Panels by id; those not there have no neighbours and no outline on the tag.
    """
    serving = _serving_of(piece, sweep)
    orders = [] if block is None else [cut.order for cut in block.cuts if cut.sweep == sweep.id]
    panel = panels.get(serving.panel) if serving is not None else None
    outline = _outline(serving, panel)
    beyond = _edges_beyond(outline, sweep)
    is_strip = serving is not None and serving.n_strips > 1
    return TagFacts(
        piece=piece,
        sweep=sweep,
        title=title if len(title) <= _LONGEST_TITLE else f"{title[: _LONGEST_TITLE - 3].rstrip()}...",
        revision=revision,
        grade=block.grade if block is not None and block.grade else "as ordered",
        cut_order=orders[0] if orders else None,
        edges={name: _edge(outward, serving, panel, name in beyond) for name, outward in BILLET_EDGES.items()},
        outline=_inside(outline, sweep) if beyond else outline,
        strip=f"strip {serving.strip} of {serving.n_strips}" if serving is not None and is_strip else "",
    )


def _serving_of(piece: Piece, sweep: Sweep) -> Serving | None:
    """Return the serving whose panel the piece belongs to: its own, or for a supporting half its partner's."""
    if piece.panel is None:
        return None
    own = [serving for serving in sweep.serving if serving.panel == piece.panel]
    same_half = [serving for serving in own if serving.half is piece.half]
    return next(iter(same_half or own), None)


def _edge(outward: Sequence[float], serving: Serving | None, panel: Panel | None, goes_on: bool) -> EdgeFact:
    if serving is None:
        return EdgeFact("", ())
    direction = serving.rotation @ np.asarray(outward)
    side = max(_PANEL_SIDES, key=lambda known: direction[known[1]] * known[2])[0]
    neighbours = () if panel is None else tuple(other for edge, other in panel.neighbours if edge == side)
    return EdgeFact(side[0].upper(), neighbours, goes_on)


def _outline(serving: Serving | None, panel: Panel | None) -> Rings:
    if serving is None or panel is None:
        return ()
    # p_panel = p_billet @ R.T + shift, and R turns the plan in itself (a half turn keeps it a plan).
    turn, shift = serving.rotation[:2, :2], serving.shift_mm[:2]
    return tuple((ring - shift) @ turn for ring in panel.outline)


def _edges_beyond(outline: Rings, sweep: Sweep) -> frozenset[str]:
    """Return the edges of the billet over which the outline reaches: there the panel goes on in another strip."""
    if not outline:
        return frozenset()
    least, most = outline[0].min(axis=0), outline[0].max(axis=0)
    reach = {
        "start": -least[0],
        "end": most[0] - sweep.length_mm,
        "near": -least[1],
        "far": most[1] - sweep.width_mm,
    }
    return frozenset(edge for edge, beyond_mm in reach.items() if beyond_mm > _SAME_EDGE_MM)


def _inside(outline: Rings, sweep: Sweep) -> Rings:
    """Return the part of the outline that lies in the billet's plan."""
    part = area_of_rings(outline).intersection(plan_box(0.0, 0.0, sweep.length_mm, sweep.width_mm))
    return tuple(ring for piece in parts_of(part) for ring in rings_of(piece))
