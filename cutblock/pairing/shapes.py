"""What the wanted surfaces look like in their billets, and which halves could serve which panels.

The upper half of a sweep, turned over by a half turn about its billet's x or y, shows the sheet z = f(x, y) as
-f(x, -y) or -f(-x, y), measured from the billet's middle; turned over about a diagonal, x = y or x = -y, which is the
same with a quarter turn about the vertical on top, as -f(y, x) or -f(-y, -x). The latter two lay its length along the
other panel's width: they serve square panels, and panels whose own sweeps run the other way. Partners are found by
comparing those with the wanted surfaces of the other panels. Mirror images (f(-x, y), -f(x, y)) cannot be reached by a
turn and are never compared.
"""

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.progress import Progress, silent
from cutblock.geometry.heights import height_field
from cutblock.geometry.sheet import sheet_heights
from cutblock.records.panel import Panel
from cutblock.records.sweep import Sweep

if TYPE_CHECKING:
    from scipy.spatial import cKDTree

# Half turns about the billet's x, its y, and the diagonals x = y and x = -y; each is symmetric and its own inverse.
TURNS = (
    np.diag([1.0, -1.0, -1.0]),
    np.diag([-1.0, 1.0, -1.0]),
    np.array([[0.0, 1.0, 0.0], [1.0, 0.0, 0.0], [0.0, 0.0, -1.0]]),
    np.array([[0.0, -1.0, 0.0], [-1.0, 0.0, 0.0], [0.0, 0.0, -1.0]]),
)
_ACROSS = 2  # from this turn on length and width change places
SIZE_MM = 0.5  # largest difference of two billets' sides
OUTLINE_MM = 1.0  # largest distance of two outlines
N_GRID = 15
_N_KEPT = 6  # rows and columns of the cosine transform in a descriptor
_WHOLE = 0.985  # part of the plan compared: nearly all, as bench panels are not quite rectangles
_CORE = 0.5  # part of the plan compared where that reaches beyond the panel's outline
_NOTHING = 2  # the domain where not even the core lies within the outline
_SMOOTH = 0.05  # of the distance allowed to outlines: how far they are smoothed before
_SAME_MM = 0.02  # panels this much alike count as one shape
_N_SEARCHED = 10  # coefficients of a descriptor that are searched by
_RADIUS = np.sqrt(2.0) * (1.0 + 1e-9)
_N_NEAREST = 32  # candidates looked at for each shape and turn
_HEADINGS = np.linspace(0.0, 2.0 * np.pi, 8, endpoint=False)
_HEADING_VECTORS = np.stack([np.cos(_HEADINGS), np.sin(_HEADINGS)])  # (2, 8)


class Shapes(NamedTuple):
    """The surfaces of n sweeps in frames about the middle of their billets; grids (n, 15, 15), mm."""

    sizes: Floats  # (n, 2) length and width of the billet
    corners: tuple[Floats, ...]  # (k, 2) the panel's outline over the billet
    domains: Ints  # (n,) compared over 0 nearly the whole panel, 1 its core, 2 nothing
    wanted: Floats  # heights of the panel's surface, their mean taken off
    cut: Floats  # heights of the sheet, their mean taken off


class Candidate(NamedTuple):
    """The upper half of `lower`, turned by `TURNS[turn]`, as a mould of the panel of `upper`."""

    lower: int
    upper: int
    turn: int
    misfit_mm: float  # half the range of their height differences: what the best vertical shift leaves


def describe_shapes(
    panels: Mapping[str, Panel], sweeps: Sequence[Sweep], margin_mm: float, progress: Progress = silent
) -> Shapes:
    """Return the shapes of sweeps that each serve one panel with their lower half.

    Args:
        panels: By id.
        sweeps: With one serving each.
        margin_mm: Foam round a panel that is not compared.
        progress: Told now and then.
    """
    corners, domains, wanted, cut = [], [], [], []
    for index, sweep in enumerate(sweeps):
        if index % 100 == 0:
            progress(index / len(sweeps), "Describing the panels")
        panel = panels[sweep.serving[0].panel]
        ring = _outline(panel, sweep, margin_mm)
        domain = _domain(panel, ring, sweep, margin_mm)
        scale = _CORE if domain == 1 else _WHOLE
        steps = np.linspace(-1.0, 1.0, N_GRID)
        along, aside = sweep.length_mm / 2.0, sweep.width_mm / 2.0
        x = along + steps * scale * (along - margin_mm)
        y = aside + steps * scale * (aside - margin_mm)
        grid = np.stack(np.meshgrid(x, y, indexing="ij"), axis=-1)
        corners.append(ring)
        domains.append(domain)
        wanted.append(_wanted_heights(panel, sweep, grid))
        cut.append(sheet_heights(sweep.near, sweep.far, sweep.width_mm, grid[..., 0], grid[..., 1]))
    return Shapes(
        sizes=np.array([(sweep.length_mm, sweep.width_mm) for sweep in sweeps]).reshape(-1, 2),
        corners=tuple(corners),
        domains=np.array(domains, dtype=np.int64),
        wanted=_centred(wanted),
        cut=_centred(cut),
    )


def _centred(grids: list[Floats]) -> Floats:
    stack = np.array(grids).reshape(-1, N_GRID, N_GRID)
    centred: Floats = stack - stack.mean(axis=(1, 2), keepdims=True)
    return centred


def _wanted_heights(panel: Panel, sweep: Sweep, plan: Floats) -> Floats:
    """Return the panel's surface above plan points (..., 2) of the billet, up to a constant."""
    serving = sweep.serving[0]
    points = plan @ serving.rotation[:2, :2].T + serving.shift_mm[:2]
    field = height_field(panel.heights_mm, panel.length_mm, panel.width_mm)
    return field.values(points[..., 0], points[..., 1])


def _outline(panel: Panel, sweep: Sweep, margin_mm: float) -> Floats:
    """Return the outer ring of the panel over the billet, about the billet's middle."""
    serving = sweep.serving[0]
    middle = np.array([sweep.length_mm, sweep.width_mm]) / 2.0
    inner = middle - margin_mm
    if panel.is_rectangle:
        return np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]) * inner
    import shapely

    ring = (panel.outline[0] - serving.shift_mm[:2]) @ serving.rotation[:2, :2] - middle
    over = shapely.Polygon(ring).intersection(shapely.box(*-middle, *middle))
    largest = max(shapely.get_parts(over), key=lambda part: part.area, default=shapely.Polygon())
    coordinates = np.asarray(largest.exterior.coords)[:-1] if largest.geom_type == "Polygon" else np.empty((0, 2))
    return coordinates if len(coordinates) else ring


def _domain(panel: Panel, ring: Floats, sweep: Sweep, margin_mm: float) -> int:
    if panel.is_rectangle:
        return 0
    import shapely

    outline = shapely.Polygon(ring).buffer(0.1)
    reach = np.array([sweep.length_mm, sweep.width_mm]) / 2.0 - margin_mm
    for domain, share in ((0, _WHOLE), (1, _CORE)):
        if outline.contains(shapely.box(*-share * reach, *share * reach)):
            return domain
    return _NOTHING


def group_alike(shapes: Shapes) -> list[list[int]]:
    """Return the sweeps in groups of one shape each, in order of their first members, members in order.

    Each member lies within 0.02 mm of its group's first in descriptor distance, and so does its outline.
    """
    from scipy.spatial import cKDTree

    if not len(shapes.sizes):
        return []
    # Billets and outlines must be alike as closely as the heights.
    vectors = np.hstack(
        [shapes.sizes, 1e3 * shapes.domains[:, None], _supports(shapes.corners), _cosines(shapes.wanted)]
    )
    tree = cKDTree(vectors)
    group_of = np.full(len(vectors), -1)
    groups: list[list[int]] = []
    for index in range(len(vectors)):  # one query for each new shape
        if group_of[index] < 0:
            near = np.sort(np.asarray(tree.query_ball_point(vectors[index], _SAME_MM), dtype=np.int64))
            ring = shapes.corners[index]
            members = [k for k in near[group_of[near] < 0].tolist() if _agree(ring, shapes.corners[k], _SAME_MM)]
            group_of[members] = len(groups)
            groups.append(members)
    return groups


def find_candidates(
    shapes: Shapes,
    tolerance_mm: float,
    n_nearest: int = _N_NEAREST,
    *,
    size_mm: float = SIZE_MM,
    outline_mm: float = OUTLINE_MM,
) -> list[Candidate]:
    """Return which upper halves could mould which panels, by their heights on the grid.

    Billet sizes and heights of a true partner's descriptor each lie within 1 of the half's, so a search in a radius of
    sqrt(2) misses none: the cosine transform keeps distances, leaving coefficients out only shortens them, and the root
    mean square is at most the largest difference. Only the coefficients that vary most are searched by; what is found
    is held against the grids and the outlines.

    Args:
        shapes: Of n sweeps, best one of each group.
        tolerance_mm: Largest height difference after the best vertical shift.
        n_nearest: At most so many panels are looked at for each half and turn, the nearest first.
        size_mm: Largest difference of two billets' sides.
        outline_mm: Largest distance of two outlines.

    Returns:
        Candidates in order of lower, upper, turn; a half with its own panel included.
    """
    from scipy.spatial import cKDTree

    n = len(shapes.sizes)
    if not n:
        return []
    height_scale = np.where(shapes.domains == _NOTHING, 0.0, 1.0 / tolerance_mm)[:, None]
    frames = np.hstack([1e3 * shapes.domains[:, None], shapes.sizes / (size_mm * np.sqrt(2.0))])
    heights = _cosines(shapes.wanted) * height_scale
    telling = np.sort(np.argsort(-heights.var(axis=0), kind="stable")[:_N_SEARCHED])
    tree = cKDTree(np.hstack([frames, heights[:, telling]]))
    found: list[Candidate] = []
    for turn, matrix in enumerate(TURNS):
        own = frames if turn < _ACROSS else frames[:, [0, 2, 1]]
        asking = np.flatnonzero(_has_like(own, frames))
        if not len(asking):
            continue
        turned = turned_over(shapes.cut[asking], turn)
        faces = _cosines(turned) * height_scale[asking]
        lower, upper = _near(tree, np.hstack([own[asking], faces[:, telling]]), min(n_nearest, n))
        # A few points of the grids already tell most that do not fit.
        few = _misfits(turned[lower, ::3, ::3], shapes.wanted[upper, ::3, ::3]) <= tolerance_mm
        few |= shapes.domains[upper] == _NOTHING
        few &= np.abs(own[asking[lower], 1:] - frames[upper, 1:]).max(axis=1, initial=0.0) * np.sqrt(2.0) <= 1.0 + 1e-9
        lower, upper = lower[few], upper[few]
        misfits = np.where(shapes.domains[upper] == _NOTHING, 0.0, _misfits(turned[lower], shapes.wanted[upper]))
        fits = misfits <= tolerance_mm
        first, second, misfits = asking[lower[fits]], upper[fits], misfits[fits]
        agree = _agreeing(shapes.corners, matrix[:2, :2], first, second, outline_mm)
        rows = (first[agree].tolist(), second[agree].tolist(), misfits[agree].tolist())
        found += [Candidate(lower, upper, turn, misfit) for lower, upper, misfit in zip(*rows, strict=True)]
    return sorted(found)


def _has_like(frames: Floats, others: Floats) -> Bools:
    """Return which rows (kind, two sides) have a like among the others, in a search radius."""
    from scipy.spatial import cKDTree

    distances, _ = cKDTree(np.unique(others, axis=0)).query(frames, distance_upper_bound=_RADIUS)
    is_like: Bools = np.isfinite(distances)
    return is_like


def _near(tree: "cKDTree", queries: Floats, n_nearest: int) -> tuple[Ints, Ints]:
    """Return the rows of the queries and of the tree that lie within the radius of each other, the nearest ones."""
    _, nearest = tree.query(queries, k=n_nearest, distance_upper_bound=_RADIUS)
    nearest = np.reshape(nearest, (len(queries), -1))
    row, place = np.nonzero(nearest < tree.n)
    return row, nearest[row, place]


def _misfits(faces: Floats, wanted: Floats) -> Floats:
    """Return half the ranges of the height differences of grids (k, m, m): what the best vertical shifts leave."""
    differences = faces - wanted
    halves: Floats = (differences.max(axis=(1, 2)) - differences.min(axis=(1, 2))) / 2.0
    return halves


def turned_over(grids: Floats, turn: int) -> Floats:
    """Return the faces (n, 15, 15) that upper halves show after `TURNS[turn]`; twice gives the grids again."""
    if turn >= _ACROSS:
        across = -grids.transpose(0, 2, 1)
        return across if turn == 2 else across[:, ::-1, ::-1]
    return -grids[:, :, ::-1] if turn == 0 else -grids[:, ::-1, :]


def _cosines(grids: Floats) -> Floats:
    """Return the first coefficients of the orthonormal cosine transform of grids, in mm root mean square."""
    from scipy.fft import dctn

    kept = dctn(grids, axes=(1, 2), norm="ortho")[:, :_N_KEPT, :_N_KEPT].reshape(len(grids), -1)
    result: Floats = kept[:, 1:] / N_GRID
    return result


def _supports(rings: Sequence[Floats]) -> Floats:
    """Return how far each outline reaches in eight directions, scaled so that rows differ by at most their distance."""
    reaches: Floats = np.array([(ring @ _HEADING_VECTORS).max(axis=0) for ring in rings]).reshape(-1, 8)
    reaches /= np.sqrt(8.0)
    return reaches


def _agreeing(corners: Sequence[Floats], turn: Floats, lower: Ints, upper: Ints, within_mm: float) -> Bools:
    """Return which pairs of outlines, the first ones turned, lie within a distance of each other."""
    four = [ring if ring.shape == (4, 2) else np.full((4, 2), np.nan) for ring in corners]
    own = np.array(four).reshape(-1, 4, 2)
    # Outlines with the same four corners need no dear way; the turns keep every digit.
    agree: Bools = (_in_order(own @ turn)[lower] == _in_order(own)[upper]).all(axis=(1, 2))
    reaches, turned_reaches = _supports(corners), _supports([ring @ turn for ring in corners])
    is_near = np.abs(turned_reaches[lower] - reaches[upper]).max(axis=1, initial=0.0) * np.sqrt(8.0) <= within_mm
    rest = np.flatnonzero(~agree & is_near)
    if len(rest):
        rings = _simple_rings(corners, within_mm)
        turned = _simple_rings([ring @ turn for ring in corners], within_mm)
        import shapely

        agree[rest] = shapely.hausdorff_distance(turned[lower[rest]], rings[upper[rest]]) <= within_mm
    return agree


def _simple_rings(corners: Sequence[Floats], within_mm: float) -> Any:  # noqa: ANN401 - shapely ships no types
    """Return outlines as rings without the points that hardly bend them: those of curved panels have hundreds."""
    import shapely

    rings = np.array([shapely.LinearRing(ring) for ring in corners], dtype=object)
    return shapely.simplify(rings, _SMOOTH * within_mm)


def _in_order(rings: Floats) -> Floats:
    """Return the corners (n, 4, 2) of each ring in order of x, then y."""
    order = np.lexsort((rings[..., 1], rings[..., 0]), axis=1)
    ordered: Floats = np.take_along_axis(rings, order[..., None], axis=1)
    return ordered


def _agree(first: Floats, second: Floats, within_mm: float) -> bool:
    """Return whether two rings lie within a distance of each other."""
    if np.array_equal(first, second):
        return True
    import shapely

    return bool(shapely.hausdorff_distance(shapely.LinearRing(first), shapely.LinearRing(second)) <= within_mm)
