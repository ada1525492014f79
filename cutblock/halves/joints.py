"""The planes in which neighbouring panels meet: one for both, from the form's own chord and normals at the joint."""

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.geometry.frames import unit
from cutblock.records.panel import Panel, PanelEdge

_MEET_MM = 0.1  # edges whose ends lie closer are one joint; faces of separate files meet no better
_OPPOSED = 0.1  # length of the sum of two unit normals that look away from each other


class SidePlanes(NamedTuple):
    """The planes through the edges of one panel, in the form; inside is where p @ normal >= distance."""

    normals: Floats  # (k, 3) unit, into the panel
    distances_mm: Floats  # (k,)
    joins: tuple[str, ...]  # the panel of the same copy beyond each edge, or of another face; empty at a free edge


def side_planes(panels: Sequence[Panel]) -> dict[str, SidePlanes]:
    """Return the planes of the sides of every panel by its id.

    The plane holds the edge's chord and the mean of the form's normals along it; where two edges are one joint, of
    both panels' normals. The two panels at a joint get the same numbers with the opposite sign. Edges of which one
    meets several others, or that meet seen from opposite sides, stand alone.

    Args:
        panels: With their edges; copies of a panel get the planes of the first.
    """
    firsts = [panel for panel in panels if panel.copy == 1]
    owners = [panel for panel in firsts for _ in panel.edges]
    edges = [edge for panel in firsts for edge in panel.edges]
    partners = _partners(edges)
    planes = [
        _plane(edge, None if partner < 0 else edges[partner])
        for edge, partner in zip(edges, partners.tolist(), strict=True)
    ]
    found: dict[tuple[str, int, int], SidePlanes] = {}
    start = 0
    for panel in firsts:
        rows = range(start, start + len(panel.edges))
        start += len(panel.edges)
        found[_cell(panel)] = SidePlanes(
            np.array([planes[row][0] for row in rows]).reshape(-1, 3),
            np.array([planes[row][1] for row in rows]),
            tuple(owners[partners[row]].id if partners[row] >= 0 else "" for row in rows),
        )
    return {panel.id: found[_cell(panel)]._replace(joins=_joins(panel, found[_cell(panel)])) for panel in panels}


def _cell(panel: Panel) -> tuple[str, int, int]:
    return panel.face, panel.row, panel.column


def _joins(panel: Panel, planes: SidePlanes) -> tuple[str, ...]:
    """Return what lies beyond the edges of one copy: its own neighbours, else panels of other faces."""
    beside = dict(panel.neighbours)
    return tuple(beside.get(edge.name, other) for edge, other in zip(panel.edges, planes.joins, strict=True))


def _plane(edge: PanelEdge, other: PanelEdge | None) -> tuple[Floats, float]:
    """Return the inward unit normal and the distance of an edge's plane.

    For the edge that runs the other way it is the same to the last digit, with the opposite sign: no sum or product
    here depends on which of the two comes first.
    """
    start, end, normal = edge.start_mm, edge.end_mm, edge.normal
    if other is not None:
        start, end, normal = (start + other.end_mm) / 2.0, (end + other.start_mm) / 2.0, normal + other.normal
    inwards = unit(np.cross(normal, end - start))
    return inwards, float(inwards @ (start + end)) / 2.0


def _partners(edges: Sequence[PanelEdge]) -> Ints:
    """Return for each edge the one that runs along it the other way, or -1."""
    from scipy.spatial import cKDTree

    partners = np.full(len(edges), -1)
    if not edges:
        return partners
    starts, ends, normals = (
        np.array([getattr(edge, name) for edge in edges]) for name in ("start_mm", "end_mm", "normal")
    )
    pairs = cKDTree((starts + ends) / 2.0).query_pairs(_MEET_MM, output_type="ndarray")
    first, second = pairs[np.lexsort(pairs.T[::-1])].T
    is_one = (
        (np.linalg.norm(starts[first] - ends[second], axis=1) < _MEET_MM)
        & (np.linalg.norm(ends[first] - starts[second], axis=1) < _MEET_MM)
        & (np.linalg.norm(normals[first] + normals[second], axis=1) > _OPPOSED)
    )
    first, second = first[is_one], second[is_one]
    counts = np.bincount(np.concatenate([first, second]), minlength=len(edges))
    is_pair = (counts[first] == 1) & (counts[second] == 1)
    partners[first[is_pair]], partners[second[is_pair]] = second[is_pair], first[is_pair]
    return partners
