"""The foam that stands on the machine while a program runs, as its comments tell the hand to leave or take it away.

Read from the text line by line with plain string work; the boxes come from `kit.standing`.
"""

import re

import numpy as np
import shapely
from kit.standing import Box

WORD = re.compile(r"([A-Z])(-?[\d.]+)")


def touched_foam(stand, text, wire_mm):
    """Return (line number, line, box) for every move that leads the wire to foam it may not touch.

    A cold wire may touch none, a hot one only the part of the cut it makes. The wire goes straight between its ends,
    so that what it sweeps at a height between two faces of a box lies in the hull of its four ends there.

    Args:
        stand: The set-up's `Stand`.
        text: Of its program.
        wire_mm: The wire's diameter.
    """
    boxes = [stand.part(stand.set_up.cuts[0])]
    cuts = iter(stand.set_up.cuts)
    axes = stand.machine["axes"]
    heat = stand.machine["heater_on"].split("{")[0]
    position, cut, is_hot, pause, found = np.zeros(4), None, False, "", []
    for number, line in enumerate(text.splitlines(), start=1):
        if line.startswith("(Cut "):
            cut = next(cuts)
        elif line.startswith("(Pause."):
            pause = line
        elif line.startswith(("G0 ", "G1 ")):
            words = dict(WORD.findall(line[3:]))
            target = np.array([float(words.get(axis, at)) for axis, at in zip(axes, position, strict=True)])
            spared = stand.part(cut) if is_hot else None
            others = [box for box in boxes if spared is None or not is_same(box, spared)]
            found += [(number, line, box) for box in others if gap(position, target, box, stand) < wire_mm / 2]
            position = target
        elif line == stand.machine["heater_off"]:
            boxes = parted(boxes, stand, cut) if is_hot else boxes
            is_hot = False
        elif line.startswith(heat):
            is_hot = True
        elif line == "M0":
            boxes = left_by_hand(boxes, stand, cut, pause)
    return found


def is_same(box, other):
    """Tell whether two boxes are one."""
    return np.allclose(box.low, other.low) and np.allclose(box.high, other.high)


def gap(start, end, box, stand):
    """Return the least distance, mm, between a box and the hull of the wire's way, seen along the wire."""
    shares = np.array([box.low[1], box.high[1]]) / stand.machine["span_mm"]
    points = [ends[:2] + share * (ends[2:] - ends[:2]) for ends in (start, end) for share in shares]
    hull = shapely.MultiPoint(np.array(points)).convex_hull
    return hull.distance(shapely.box(box.low[0], box.low[2], box.high[0], box.high[2]))


def parted(boxes, stand, cut):
    """Return the boxes after a cut; the halves of a sweep count as the whole billet."""
    if cut["kind"] == "sweep":
        return boxes
    part, slab = stand.part(cut), stand.slab(cut)
    (whole,) = [box for box in boxes if is_same(box, part)]
    others = [box for box in boxes if box is not whole]
    axis = int(np.argmax(slab.low - part.low + part.high - slab.high))
    below, above = part.high.copy(), part.low.copy()
    below[axis], above[axis] = slab.low[axis], slab.high[axis]
    pieces = [Box(part.low, below), Box(above, part.high)]
    return others + [piece for piece in pieces if (piece.high - piece.low > 1e-6).all()]


def left_by_hand(boxes, stand, cut, pause):
    """Return the boxes after the hand has done what the comment before the pause says."""
    if "Take away both halves" in pause:
        return [box for box in boxes if not is_same(box, stand.part(cut))]
    if "Hold both parts" in pause or "Put shims" in pause:
        return boxes
    part, slab = stand.part(cut), stand.slab(cut)
    axis = int(np.argmax(slab.low - part.low + part.high - slab.high))
    mine = [box for box in boxes if (box.low >= part.low - 1e-6).all() and (box.high <= part.high + 1e-6).all()]
    gone = {
        "on the start side": [box for box in mine if box.high[axis] <= slab.low[axis] + 1e-6],
        "on the end side": [box for box in mine if box.low[axis] >= slab.high[axis] - 1e-6],
        "Take off the freed upper part": [box for box in mine if box.low[axis] >= slab.high[axis] - 1e-6],
        "Draw the two parts apart": mine,
    }
    taken = next(boxes for words, boxes in gone.items() if words in pause)
    return [box for box in boxes if not any(box is other for other in taken)]
