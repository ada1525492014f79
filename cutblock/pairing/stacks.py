"""Grouping the panels' own sweeps into stacks: several shells in one billet, where that takes less foam.

Stacks are grown shell by shell by cheapest insertion (Rosenkrantz, Stearns and Lewis, SIAM Journal on Computing 6,
1977) on sampled heights, then settled with exact spacings and the best order. A sweep that serves two panels now is
only saved when both of them are in stacks.
"""

from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from cutblock.base.arrays import Bools, Floats, Ints
from cutblock.base.errors import GeometryError
from cutblock.base.progress import Progress, silent
from cutblock.geometry.rails import sheet_range
from cutblock.geometry.sheet import sheet_heights
from cutblock.geometry.stacking import largest_rise, steepest_slope, turned_rails, widened_rails
from cutblock.pairing.ordering import MOST_MEMBERS, shortest_order
from cutblock.records.shop import Machine
from cutblock.records.sweep import Sweep

ALIKE_AREA = 1.02  # of the common rectangle, by that of a member's billet
COVER_MM = 10.0  # foam over the highest cut, that the wire stays in it; common practice, no source
CLEARANCE_MM = 20.0  # the wire passes this far above a part, as the machine code keeps it
STAND_STEP_MM = 10.0  # that a stand's height and a billet's place on the table can be set to
_N_SIDE = 13  # heights a side that shapes are compared by at first

Rails = tuple[Floats, Floats]


class StackRule(NamedTuple):
    """What a stack must keep."""

    shell_mm: float  # least thickness along the normal
    kerf_mm: float  # widest
    is_even: bool  # the lowest shell is cut off below too
    rooms_mm: tuple[tuple[float, float, float], ...]  # length, width and height of blocks without their skin
    machine: Machine

    def gap_mm(self, slope: Floats | float) -> Floats:
        """Return how far one sheet must be over another one everywhere, (...), the flatter one's slope given.

        A point that lies this far over a sheet of slope s is gap / sqrt(1 + s^2) away from it at least: shell and
        half a kerf on either side.
        """
        gap: Floats = (self.shell_mm + self.kerf_mm) * np.sqrt(1.0 + np.asarray(slope) ** 2)
        return gap

    def base_mm(self, slope: Floats | float) -> Floats:
        """Return how far the lowest point of the lowest shell's sheet must be over the bottom, (...)."""
        if self.is_even:
            return COVER_MM + self.kerf_mm / 2.0 + self.gap_mm(slope)
        return np.full(np.shape(slope), self.shell_mm + self.kerf_mm / 2.0)

    @property
    def top_mm(self) -> float:
        """How far the billet must reach over the highest point of the highest sheet."""
        return self.kerf_mm / 2.0 + COVER_MM


class Nest(NamedTuple):
    """Sweeps in one billet, from below."""

    members: tuple[int, ...]  # numbers of the sweeps
    is_turned: tuple[bool, ...]
    size_mm: tuple[float, float, float]  # of the billet
    rails: tuple[Rails, ...]  # over the whole billet, lifted to where they are cut
    levels_mm: tuple[float, ...]  # of the middles of the sheets' heights
    base_mm: float  # of the lowest sheet's middle over the cut below it, or over the bottom

    @property
    def volume_mm3(self) -> float:
        """Of the billet."""
        length, width, height = self.size_mm
        return length * width * height


class Attempt(NamedTuple):
    """A stack that was thought of."""

    members: tuple[int, ...]
    now_mm3: float
    stacked_mm3: float
    fits: bool  # into a block, and under the wire


def group_stacks(
    sweeps: Sequence[Sweep],
    units: Sequence[tuple[int, ...]],
    foam_mm3: Floats,
    is_free: Bools,
    rule: StackRule,
    progress: Progress = silent,
) -> tuple[tuple[Nest, ...], Attempt | None]:
    """Return stacks that take less foam each than their members take now.

    Args:
        sweeps: Of every panel its own, the lower half its mould.
        units: Numbers of those that are cut as one sweep now; each at most once.
        foam_mm3: (n,) what each takes now: its billet, or half the one it shares.
        is_free: (n,) which may be stacked at all.
        rule: What a stack must keep.
        progress: Told now and then; may raise Cancelled.

    Returns:
        The stacks in the order of their first sweeps, and the attempt that came nearest where there is none.
    """
    free: list[int] = np.flatnonzero(is_free).tolist()
    n_free = max(1, len(free))
    search = _Search(sweeps, foam_mm3, rule, lambda: progress(1.0 - len(free) / n_free, "Stacking shells"))
    nests: list[Nest] = []
    while free:
        search.report()
        nest = search.settled(search.grown(free))
        if nest is None:
            free.pop(0)
            continue
        nests.append(nest)
        free[:] = [number for number in free if number not in nest.members]
    nests = search.whole_units(nests, units)
    nests.sort(key=lambda nest: min(nest.members))
    return tuple(nests), None if nests else search.nearest


class _Search:
    """The sheets of the sweeps, compared as far as asked for."""

    def __init__(
        self, sweeps: Sequence[Sweep], foam_mm3: Floats, rule: StackRule, report: Callable[[], None] = lambda: None
    ) -> None:
        self.rule, self.foam, self.report = rule, foam_mm3, report
        self.nearest: Attempt | None = None
        self.sizes = np.array([(sweep.length_mm, sweep.width_mm) for sweep in sweeps]).reshape(-1, 2)
        self.along = np.array([sweep.wire_along for sweep in sweeps])
        middles = np.array([np.mean(_range(sweep)) for sweep in sweeps]).reshape(-1, 1)
        self.rails: list[Rails] = [
            (sweep.near - [0.0, middle[0]], sweep.far - [0.0, middle[0]])
            for sweep, middle in zip(sweeps, middles, strict=True)
        ]
        self.half_ranges = np.array([(high - low) / 2.0 for low, high in map(_range, sweeps)])
        self.slopes = np.array(
            [steepest_slope(*rails, *size) for rails, size in zip(self.rails, self.sizes.tolist(), strict=True)]
        )
        straight = np.array([_samples(rails, size) for rails, size in zip(self.rails, self.sizes, strict=True)])
        straight = straight.reshape(len(sweeps), _N_SIDE**2)
        self.heights = np.stack([straight, straight[:, ::-1]])  # turned half round the samples run backwards
        self.stands, self.overs = self._run_out()
        self._rises: dict[tuple[object, ...], float] = {}

    def _run_out(self) -> tuple[Floats, Floats]:
        """Return how high a stand keeps a sheet's rulings, cut lowest, over the towers' zero, and how far they rise.

        Both (2, n): with the billet's near face on the table's near edge, and with the billet midway between the
        towers, where rulings run out least. They rise over the top of a billet whose highest sheet it is, the wire
        at least to clear it.
        """
        tool, rule = self.rule.machine, self.rule
        setbacks = (0.5 * (tool.span_mm - self.sizes[:, 1]) - tool.near_gap_mm) // STAND_STEP_MM * STAND_STEP_MM
        lows, highs = np.empty((2, len(self.rails))), np.empty((2, len(self.rails)))
        for number, ((near, far), width) in enumerate(zip(self.rails, self.sizes[:, 1].tolist(), strict=True)):
            slopes = (far[:, 1] - near[:, 1]) / width
            for place, setback in enumerate((0.0, max(0.0, float(setbacks[number])))):
                at_near = near[:, 1] - (tool.near_gap_mm + setback) * slopes
                at_far = at_near + tool.span_mm * slopes
                lows[place, number] = min(at_near.min(), at_far.min())
                highs[place, number] = max(at_near.max(), at_far.max())
        below = COVER_MM if rule.is_even else rule.shell_mm
        missing = -(below + rule.kerf_mm / 2.0 + self.half_ranges + lows + tool.table_height_mm)
        stands = STAND_STEP_MM * np.ceil(np.maximum(missing, 0.0) / STAND_STEP_MM)
        return stands, np.maximum(highs - self.half_ranges - rule.top_mm, CLEARANCE_MM)

    def _lift_mm(self, taken: Sequence[int], rest: Ints) -> Floats:
        """Return how high a billet of some sweeps and another one, each of the rest in turn, may be for the towers."""
        tool = self.rule.machine
        parts = (np.maximum(some[:, rest], some[:, taken].max(axis=1)[:, None]) for some in (self.stands, self.overs))
        lifts: Floats = (tool.lift_mm - tool.table_height_mm - sum(parts)).max(axis=0)
        return lifts

    def _room_mm(self, lengths: Floats, widths: Floats) -> Floats:
        """Return how high a billet may be for the blocks, (n,); minus infinity where none holds it."""
        room = np.full(len(lengths), -np.inf)
        for length, width, height in self.rule.rooms_mm:
            fits = (lengths <= length) & (widths <= width) | (lengths <= width) & (widths <= length)
            room = np.where(fits, np.maximum(room, height), room)
        return room

    def grown(self, free: Sequence[int]) -> list[tuple[int, bool]]:
        """Return sweeps, with whether they are turned, that the first free one makes a stack with, as they came."""
        numbers = np.array(free)
        rule, seed = self.rule, int(numbers[0])
        firsts, lasts = self.half_ranges + rule.base_mm(self.slopes), self.half_ranges + rule.top_mm
        chosen, path = [(seed, False)], [(seed, False)]
        height = float(firsts[seed] + lasts[seed])
        while len(chosen) < MOST_MEMBERS:
            taken = [number for number, _ in chosen]
            rest = numbers[~np.isin(numbers, taken)]
            size = self.sizes[taken].max(axis=0)
            common = np.maximum(self.sizes[rest], size)
            areas = common.prod(axis=1)
            smallest = np.minimum(self.sizes[rest].prod(axis=1), self.sizes[taken].prod(axis=1).min())
            room = np.minimum(self._room_mm(*common.T), self._lift_mm(taken, rest))
            is_alike = (areas <= ALIKE_AREA * smallest) & (self.along[rest] == self.along[seed])
            rest, areas, room = rest[is_alike], areas[is_alike], room[is_alike]
            if not len(rest):
                break
            options = [self._insertions(path, rest, turned, firsts, lasts) for turned in (False, True)]
            heights = height + np.stack([added for added, _ in options])
            worths = self.foam[rest] - (areas * heights - size.prod() * height)
            fits = heights <= room
            turned, place = divmod(int(np.argmax(np.where(fits, worths, -np.inf) if fits.any() else worths)), len(rest))
            if len(chosen) == 1:
                self._note((seed, int(rest[place])), areas[place] * heights[turned, place], fits=bool(fits.any()))
            if not (fits.any() and worths[turned, place] > 0.0):
                break
            new = int(rest[place]), bool(turned)
            chosen.append(new)
            path.insert(int(options[turned][1][place]), new)
            height = float(heights[turned, place])
        return chosen

    def _insertions(
        self, path: Sequence[tuple[int, bool]], rest: Ints, turned: bool, firsts: Floats, lasts: Floats
    ) -> tuple[Floats, Ints]:
        """Return by how much each sweep makes the stack higher, (n,), put in where it does so least, and where."""
        heights = self.heights[int(turned), rest]
        over, under = [], []  # of each sweep over and under each of the path
        for number, is_turned in path:
            own = self.heights[int(is_turned), number]
            gap = self.rule.gap_mm(np.minimum(self.slopes[number], self.slopes[rest]))
            over.append(gap + (own - heights).max(axis=1))
            under.append(gap + (heights - own).max(axis=1))
        added = [firsts[rest] + under[0] - firsts[path[0][0]]]
        for place in range(1, len(path)):
            (below, is_below_turned), (above, is_above_turned) = path[place - 1], path[place]
            step = self.heights[int(is_below_turned), below] - self.heights[int(is_above_turned), above]
            gap = self.rule.gap_mm(min(self.slopes[below], self.slopes[above]))
            added.append(over[place - 1] + under[place] - (gap + step.max()))
        added.append(over[-1] + lasts[rest] - lasts[path[-1][0]])
        table = np.stack(added)
        places = table.argmin(axis=0)
        return table[places, np.arange(len(rest))], places

    def settled(self, chosen: Sequence[tuple[int, bool]]) -> Nest | None:
        """Return sweeps as a stack in the best order, the last ones left off until it fits; None where none saves."""
        while len(chosen) > 1:
            nest = self._nest(chosen)
            if nest is not None:
                members = tuple(number for number, _ in chosen)
                self._note(members, nest.volume_mm3, fits=True)
                return nest if nest.volume_mm3 < self.foam[list(members)].sum() else None
            chosen = chosen[:-1]
        return None

    def _note(self, members: tuple[int, ...], stacked_mm3: float, *, fits: bool) -> None:
        """Keep an attempt if it is the nearest to saving foam so far; one that fits goes before one that does not."""
        attempt = Attempt(members, float(self.foam[list(members)].sum()), float(stacked_mm3), fits)
        if self.nearest is None or _far_off(attempt) < _far_off(self.nearest):
            self.nearest = attempt

    def _nest(self, chosen: Sequence[tuple[int, bool]]) -> Nest | None:
        """Return sweeps as a stack in the best order; None where it is too high or a sheet cannot be widened."""
        numbers = [number for number, _ in chosen]
        length, width = self.sizes[numbers].max(axis=0).tolist()
        try:
            rails = [self._widened(number, turned, (length, width)) for number, turned in chosen]
        except GeometryError:
            return None
        slopes = np.array([steepest_slope(*pair, length, width) for pair in rails])
        ranges = np.array([sheet_range(*pair, width, length) for pair in rails])
        steps = self._steps(chosen, rails, slopes, (length, width))
        bases = self.rule.base_mm(slopes) - ranges[:, 0]
        order, total = shortest_order(bases, steps, ranges[:, 1] + self.rule.top_mm)
        height = float(np.ceil(total - 1e-6))
        room = np.minimum(
            self._room_mm(np.array([length]), np.array([width])), self._lift_mm(numbers, np.array(numbers[:1]))
        )
        if height > room[0]:
            return None
        rises = [float(bases[order[0]]), *(float(steps[a, b]) for a, b in pairwise(order))]
        lifts = np.cumsum(rises)
        middles = ranges.mean(axis=1)
        first = order[0]
        below = float(self.rule.gap_mm(slopes[first])) if self.rule.is_even else float(bases[first] + middles[first])
        return Nest(
            members=tuple(numbers[place] for place in order),
            is_turned=tuple(chosen[place][1] for place in order),
            size_mm=(length, width, height),
            rails=tuple(
                (rails[place][0] + [0.0, lift], rails[place][1] + [0.0, lift])
                for place, lift in zip(order, lifts, strict=True)
            ),
            levels_mm=tuple(float(lift + middles[place]) for place, lift in zip(order, lifts, strict=True)),
            base_mm=below,
        )

    def _widened(self, number: int, turned: bool, size: tuple[float, float]) -> Rails:
        near, far = self.rails[number]
        own = (float(self.sizes[number, 0]), float(self.sizes[number, 1]))
        if turned:
            near, far = turned_rails(near, far, own[0])
        return widened_rails(near, far, own, size)

    def _steps(
        self, chosen: Sequence[tuple[int, bool]], rails: Sequence[Rails], slopes: Floats, size: tuple[float, float]
    ) -> Floats:
        """Return how far the column's sheet must be lifted over the row's, (k, k)."""
        keys = [(near.tobytes(), far.tobytes()) for near, far in rails]
        steps = np.zeros((len(chosen), len(chosen)))
        for below in range(len(chosen)):
            self.report()
            for above in range(len(chosen)):
                key = (keys[below], keys[above], size)
                if keys[below] == keys[above]:
                    self._rises[key] = 0.0
                elif key not in self._rises:
                    self._rises[key] = largest_rise(rails[below], rails[above], *size)
                gap = self.rule.gap_mm(min(slopes[below], slopes[above]))
                steps[below, above] = gap + self._rises[key]
        return steps

    def whole_units(self, nests: list[Nest], units: Sequence[tuple[int, ...]]) -> list[Nest]:
        """Return the stacks without sweeps whose present one must be cut anyway, as long as they save foam."""
        while True:
            stacked = {number for nest in nests for number in nest.members}
            halved = {number for unit in units if not stacked.issuperset(unit) for number in unit} & stacked
            if not halved:
                return nests
            kept = []
            for nest in nests:
                rest = [pair for pair in zip(nest.members, nest.is_turned, strict=True) if pair[0] not in halved]
                again = nest if len(rest) == len(nest.members) else self.settled(rest)
                if again is not None:
                    kept.append(again)
            nests = kept


def _far_off(attempt: Attempt) -> tuple[bool, float]:
    return not attempt.fits, attempt.stacked_mm3 / attempt.now_mm3


def _range(sweep: Sweep) -> tuple[float, float]:
    return sheet_range(sweep.near, sweep.far, sweep.width_mm, sweep.length_mm)


def _samples(rails: Rails, size: Floats) -> Floats:
    places = np.linspace(0.0, 1.0, _N_SIDE)
    x, y = np.meshgrid(places * size[0], places * size[1], indexing="ij")
    heights: Floats = sheet_heights(*rails, float(size[1]), x, y).ravel()
    return heights
