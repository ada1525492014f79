"""Makes one connected, consistently turned surface of a triangle soup."""

from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.errors import GeometryError
from cutblock.base.tolerances import WELD_MM
from cutblock.base.units import place_text

GAP_MM = 0.1  # an open edge this near another one is taken to belong to it


class Shell(NamedTuple):
    """Triangles on shared vertices, with what was done to get there."""

    vertices: Floats  # (n, 3) mm
    triangles: Ints  # (m, 3)
    n_doubled: int = 0  # triangles that were there twice
    n_closed: int = 0  # vertices moved to close gaps
    n_turned: int = 0  # triangles whose winding was against the rest


class Edges(NamedTuple):
    """The sides of triangles, row by row of `triangles`, sorted so that equal edges lie together."""

    starts: Ints  # (3 m,) first vertex as the triangle runs
    ends: Ints
    owners: Ints  # (3 m,) triangle
    groups: Ints  # (3 m,) number of the edge, rising
    counts: Ints  # (e,) triangles at each edge


def edges_of(triangles: Ints) -> Edges:
    """Return the edges of (m, 3) triangles."""
    starts = triangles.ravel()
    ends = triangles[:, [1, 2, 0]].ravel()
    n = int(triangles.max(initial=0)) + 1
    key = np.minimum(starts, ends) * n + np.maximum(starts, ends)
    order = np.argsort(key, kind="stable")
    ordered = key[order]
    is_new = np.concatenate([[True], ordered[1:] != ordered[:-1]])
    groups = np.cumsum(is_new) - 1
    return Edges(starts[order], ends[order], order // 3, groups, np.bincount(groups))


def welded(vertices: Floats, triangles: Ints, face: str, units: str) -> Shell:
    """Join equal vertices, close small gaps, drop doubled and needle triangles, and turn all the same way.

    Args:
        vertices: (n, 3) mm.
        triangles: (m, 3).
        face: Name for messages.
        units: The unit of messages.

    Raises:
        GeometryError: An edge belongs to more than two triangles, or the surface has only one side.
    """
    vertices, triangles = _joined(vertices, triangles, _equal_vertices(vertices))
    triangles = _without_needles(vertices, triangles)
    triangles, n_doubled = _without_doubles(triangles)
    vertices, triangles, n_closed = _gaps_closed(vertices, triangles)
    if n_closed:
        triangles = _without_needles(vertices, triangles)
        triangles, more = _without_doubles(triangles)
        n_doubled += more
    if not len(triangles):
        raise GeometryError("has no triangle with any area", f"face {face}", "Export the mesh again.")
    edges = edges_of(triangles)
    if edges.counts.max() > 2:
        row = int(np.argmax(edges.counts[edges.groups] > 2))
        middle = 0.5 * (vertices[edges.starts[row]] + vertices[edges.ends[row]])
        raise GeometryError(
            f"{int((edges.counts > 2).sum())} edges belong to three or more triangles, one of them at "
            f"{place_text(middle, units)}; the surface branches or passes through itself",
            f"face {face}",
            "Export the visible surface alone, without ribs or inner walls.",
        )
    turned = _turned(vertices, triangles, edges, face, units)
    triangles = np.where(turned[:, None], triangles[:, ::-1], triangles)
    return Shell(vertices, triangles, n_doubled, n_closed, int(turned.sum()))


def pieces_of(shell: Shell) -> list[Ints]:
    """Return the triangle numbers of each connected piece, ordered by the lower corner of its box: x, then y, z."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components

    n = len(shell.vertices)
    first, second = shell.triangles[:, [0, 0]].ravel(), shell.triangles[:, [1, 2]].ravel()
    graph = coo_array((np.ones(len(first), dtype=np.int8), (first, second)), shape=(n, n))
    _, labels = connected_components(graph, directed=False)
    label = np.unique(labels[shell.triangles[:, 0]], return_inverse=True)[1]
    order = np.argsort(label, kind="stable")
    pieces = np.split(order, np.cumsum(np.bincount(label))[:-1])
    corners = [np.round(shell.vertices[shell.triangles[piece]].min(axis=(0, 1)), 3).tolist() for piece in pieces]
    return [pieces[index] for index in sorted(range(len(pieces)), key=lambda index: corners[index])]


def area_vectors(vertices: Floats, triangles: Ints) -> Floats:
    """Return (m, 3) normals of triangles, each as long as its area."""
    a, b, c = (vertices[triangles[:, i]] for i in range(3))
    vectors: Floats = 0.5 * np.cross(b - a, c - a)
    return vectors


def _equal_vertices(vertices: Floats) -> Ints:
    """Number the vertices so that those in one weld cell get one number."""
    label = np.zeros(len(vertices), dtype=np.int64)
    cells = np.round((vertices - vertices.min(axis=0)) / WELD_MM).astype(np.int64)
    for axis in range(3):
        across = np.unique(cells[:, axis], return_inverse=True)[1]
        label = np.unique(label * (across.max(initial=0) + 1) + across, return_inverse=True)[1]
    return label


def _joined(vertices: Floats, triangles: Ints, label: Ints) -> tuple[Floats, Ints]:
    """Keep the first vertex of each label; a triangle that names one vertex twice is dropped."""
    _, first = np.unique(label, return_index=True)
    joined = label[triangles]
    a, b, c = joined.T
    return vertices[first], joined[(a != b) & (b != c) & (c != a)]


def _without_needles(vertices: Floats, triangles: Ints) -> Ints:
    corners = vertices[triangles]
    longest = np.sqrt(((np.roll(corners, -1, axis=1) - corners) ** 2).sum(axis=2)).max(axis=1)
    areas = np.sqrt((area_vectors(vertices, triangles) ** 2).sum(axis=1))
    kept: Ints = triangles[2.0 * areas > WELD_MM * longest]
    return kept


def _without_doubles(triangles: Ints) -> tuple[Ints, int]:
    ordered = np.sort(triangles, axis=1)
    order = np.lexsort(ordered.T)
    same = (np.diff(ordered[order], axis=0) == 0).all(axis=1)
    doubled = order[1:][same]
    keep = np.ones(len(triangles), dtype=np.bool_)
    keep[doubled] = False
    return triangles[keep], len(doubled)


def _gaps_closed(vertices: Floats, triangles: Ints) -> tuple[Floats, Ints, int]:
    """Join open-edge vertices that lie closer than the gap, where no edge is as short as that."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    edges = edges_of(triangles)
    is_open = edges.counts[edges.groups] == 1
    border = np.unique(np.concatenate([edges.starts[is_open], edges.ends[is_open]]))
    if not len(border):
        return vertices, triangles, 0
    lengths = vertices[edges.ends[is_open]] - vertices[edges.starts[is_open]]
    gap = min(GAP_MM, 0.25 * float(np.sqrt((lengths**2).sum(axis=1)).min()))
    pairs = cKDTree(vertices[border]).query_pairs(gap, output_type="ndarray")
    if not len(pairs):
        return vertices, triangles, 0
    n = len(vertices)
    near = border[pairs]
    graph = coo_array((np.ones(len(near), dtype=np.int8), (near[:, 0], near[:, 1])), shape=(n, n))
    _, label = connected_components(graph, directed=False)
    moved, triangles = _joined(vertices, triangles, label.astype(np.int64))
    return moved, triangles, n - len(moved)


def _turned(vertices: Floats, triangles: Ints, edges: Edges, face: str, units: str) -> Bools:
    """Tell which triangles must be turned so that neighbours run the same way; the larger area keeps its turn."""
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import breadth_first_order, connected_components

    m = len(triangles)
    first = np.flatnonzero((edges.counts[edges.groups] == 2) & (np.append(edges.groups[1:], -1) == edges.groups))
    clashes = edges.starts[first] == edges.starts[first + 1]
    if not clashes.any():
        return np.zeros(m, dtype=np.bool_)
    a, b = edges.owners[first], edges.owners[first + 1]
    ones = np.ones(len(a), dtype=np.int8)
    _, label = connected_components(coo_array((ones, (a, b)), shape=(m, m)), directed=False)
    roots = np.unique(label, return_index=True)[1]
    # One more node joined to a triangle of every piece lets one walk reach them all.
    graph = coo_array(
        (np.ones(len(a) + len(roots), dtype=np.int8), (np.append(a, np.full(len(roots), m)), np.append(b, roots))),
        shape=(m + 1, m + 1),
    ).tocsr()
    _, before = breadth_first_order(graph, m, directed=False)
    key = np.minimum(a, b) * m + np.maximum(a, b)
    order = np.argsort(key)
    parent = np.where((before[:m] < 0) | (before[:m] == m), np.arange(m), before[:m]).astype(np.int64)
    own = np.arange(m)
    at = np.searchsorted(key[order], np.minimum(parent, own) * m + np.maximum(parent, own))
    flip = np.where(parent == own, False, clashes[order[np.minimum(at, len(order) - 1)]])
    # Pointer doubling: after k rounds `flip` is the parity over the last 2^k steps towards the root.
    while (parent != parent[parent]).any():
        flip = flip ^ flip[parent]
        parent = parent[parent]
    if ((flip[a] ^ flip[b]) != clashes).any():
        row = first[int(np.argmax((flip[a] ^ flip[b]) != clashes))]
        raise GeometryError(
            f"has only one side, like a twisted band, near {place_text(vertices[edges.starts[row]], units)}",
            f"face {face}",
            "Export the surface as one sheet.",
        )
    areas = np.sqrt((area_vectors(vertices, triangles) ** 2).sum(axis=1))
    against = np.bincount(label, areas * flip) > 0.5 * np.bincount(label, areas)
    return flip ^ against[label]
