"""Dual feasible functions of one axis: rounding rules under which sizes that fit side by side still do."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from cutblock.base.arrays import Floats, Ints

_MOST_THRESHOLDS, _LEAST_THRESHOLDS = 80, 30
_THRESHOLD_WORK = 20_000  # thresholds of an axis x distinct billets


Rule = Callable[[Ints, int, int], Floats]  # sizes, size of the block, parameter


def share(sizes: Ints, room: int, _: int) -> Floats:
    """Count sizes as they are."""
    shares: Floats = sizes / room
    return shares


def whole_parts(sizes: Ints, room: int, parts: int) -> Floats:
    """Leave k-ths of k + 1 parts and round others down to k-ths: u^(k) of Fekete and Schepers."""
    is_exact = sizes * (parts + 1) % room == 0
    result: Floats = np.where(is_exact, sizes / room, sizes * (parts + 1) // room / parts)
    return result


def drop_small(sizes: Ints, room: int, least: int) -> Floats:
    """Count what leaves less than `least` as the whole block, and what is less than it as nothing: U^(e)."""
    result: Floats = np.where(sizes > room - least, 1.0, np.where(sizes < least, 0.0, sizes / room))
    return result


def round_down(sizes: Ints, room: int, least: int) -> Floats:
    """Round to multiples: the function of Carlier, Clautiaux and Moukrim (Comput. and Oper. Research 34, 2007)."""
    steps = room // least
    rounded = np.where(2 * sizes > room, 2 * (steps - (room - sizes) // least), 2 * (sizes // least))
    result: Floats = np.where(2 * sizes == room, steps, rounded) / (2 * steps)
    return result


def count_beside(sizes: Ints, room: int, least: int) -> Floats:
    """Count big ones by the small ones that fit beside them, small ones all alike: phi^(e) of Fekete and Schepers."""
    steps = room // least
    beside = 1.0 - ((room - sizes) // least) / steps
    result: Floats = np.where(2 * sizes > room, beside, np.where(sizes >= least, 1.0 / steps, 0.0))
    return result


@dataclass(frozen=True, slots=True, eq=False)
class AxisFunctions:
    """Dual feasible functions of one axis at the sizes that occur on it.

    Attributes:
        values: (f, n) each function at the first size of every billet (length on x, width on y, height on z).
        turned: (f, n) likewise with length and width exchanged.
        rules: The rule and the parameter of each.
    """

    values: Floats
    turned: Floats
    rules: tuple[tuple[Rule, int], ...]

    def row(self, index: int) -> "AxisFunctions":
        """Return one of the functions alone."""
        one = slice(index, index + 1)
        return AxisFunctions(self.values[one], self.turned[one], self.rules[one])

    def part(self, rows: Ints, columns: Ints) -> "AxisFunctions":
        """Return some of the functions at some of the billets."""
        rules = tuple(self.rules[row] for row in rows.tolist())
        return AxisFunctions(self.values[np.ix_(rows, columns)], self.turned[np.ix_(rows, columns)], rules)


def axis_functions(cells: Ints, kind: Ints) -> tuple[AxisFunctions, AxisFunctions, AxisFunctions]:
    """Return the functions of the three axes for billets (m, 4) in a kind of block (3,)."""
    turns = cells[:, 3] > 0
    most = min(_MOST_THRESHOLDS, max(_LEAST_THRESHOLDS, _THRESHOLD_WORK // len(cells)))
    found = []
    for axis in range(3):
        other = (1, 0, 2)[axis]
        room = int(kind[axis])
        sizes = np.concatenate([cells[:, axis], cells[turns, other]])
        found.append(_functions(cells, axis, room, _rules(_thresholds(sizes[sizes <= room], room, most))))
    return found[0], found[1], found[2]


def functions_at(cells: Ints, axis: int, room: int, rule: tuple[Rule, int]) -> AxisFunctions:
    """Return one function of an axis at billets (m, 4)."""
    return _functions(cells, axis, room, (rule,))


def _functions(cells: Ints, axis: int, room: int, rules: tuple[tuple[Rule, int], ...]) -> AxisFunctions:
    """Return those of the rules that differ at the sizes of the billets."""
    other = (1, 0, 2)[axis]
    levels, place = np.unique(np.minimum(np.concatenate([cells[:, axis], cells[:, other]]), room), return_inverse=True)
    # Rules that agree at all sizes are one; the first stands for them.
    rows = {
        row.tobytes(): (row, (rule, parameter))
        for rule, parameter in reversed(rules)
        for row in [rule(levels, room, parameter)]
    }
    table = np.array([row for row, _ in rows.values()])
    kept = tuple(rule for _, rule in rows.values())
    return AxisFunctions(table[:, place[: len(cells)]], table[:, place[len(cells) :]], kept)


def _thresholds(sizes: Ints, room: int, most: int) -> Ints:
    """Return the sizes at which the functions may jump: those of the billets and of the gaps beside them, thinned."""
    both = np.unique(np.concatenate([sizes, room - sizes, sizes + 1]))
    both = both[(both > 0) & (2 * both <= room)]
    if len(both) > most:
        both = both[np.unique(np.linspace(0, len(both) - 1, most).astype(np.int64))]
    return both


def _rules(thresholds: Ints) -> tuple[tuple[Rule, int], ...]:
    jumping = [(rule, least) for least in thresholds.tolist() for rule in (drop_small, round_down, count_beside)]
    return ((share, 0), *((whole_parts, parts) for parts in range(1, 21)), *jumping)
