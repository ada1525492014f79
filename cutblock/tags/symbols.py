"""The small pictures on a tag: arrows, the duty's badge, who lifts it, and the billet from above and from the side."""

import numpy as np

from cutblock.base.arrays import Floats
from cutblock.records.drawing import Line, Mark, Polygon, Text
from cutblock.records.words import Duty, Half
from cutblock.tags.facts import TagFacts

INK, SOFT, SHADE = "#000000", "#505050", "#c4c4c4"
_LETTER = {
    Duty.MOULD: "M",
    Duty.COUNTER_MOULD: "C",
    Duty.CRADLE: "K",
    Duty.FILLER: "F",
    Duty.SURPLUS: "S",
}
_HATCH = {Duty.MOULD: "", Duty.COUNTER_MOULD: "/", Duty.CRADLE: "\\", Duty.FILLER: "x", Duty.SURPLUS: "."}
_LABEL_MM, _SMALL_MM = 1.9, 1.7  # capitals of edge names and of neighbours
_ABOVE_MM, _BELOW_MM, _BESIDE_MM = 2.2, 3.2, 3.0  # room round a plan for its caption, "NEAR" and "START"


def box(left: float, top: float, width: float, height: float) -> Floats:
    """Return the corners of a rectangle, (4, 2)."""
    return np.array([[left, top], [left + width, top], [left + width, top + height], [left, top + height]])


def arrow(x1: float, y1: float, x2: float, y2: float) -> list[Mark]:
    """Return an arrow from (x1, y1) to its tip (x2, y2)."""
    length = float(np.hypot(x2 - x1, y2 - y1))
    direction = np.array([x2 - x1, y2 - y1]) / length
    across = np.array([-direction[1], direction[0]])
    tip = np.array([x2, y2])
    back = tip - min(2.4, 0.6 * length) * direction
    head = np.array([tip, back + 1.1 * across, back - 1.1 * across])
    return [
        Line(x1_mm=x1, y1_mm=y1, x2_mm=float(back[0]), y2_mm=float(back[1]), width_mm=0.5),
        Polygon(points_mm=head, fill=INK, stroke="", width_mm=0.0),
    ]


def duty_badge(duty: Duty, left: float, top: float, side: float) -> list[Mark]:
    """Return a square with the duty's letter: solid for a mould, hatched for the others, told apart in grey too."""
    is_solid = duty is Duty.MOULD
    frame = box(left, top, side, side)
    marks: list[Mark] = [Polygon(points_mm=frame, fill=INK if is_solid else "", hatch=_HATCH[duty], width_mm=0.4)]
    if not is_solid:  # a white patch keeps the letter readable over the hatch
        inset = 0.19 * side
        patch = box(left + inset, top + inset, side - 2.0 * inset, side - 2.0 * inset)
        marks.append(Polygon(points_mm=patch, fill="#ffffff", stroke="", width_mm=0.0))
    cap = 0.53 * side
    letter = Text(
        x_mm=left + side / 2.0,
        y_mm=top + (side + cap) / 2.0,
        text=_LETTER[duty],
        size_mm=cap,
        anchor="middle",
        is_bold=True,
        colour="#ffffff" if is_solid else INK,
    )
    return [*marks, letter]


def lift_words(n_persons: int) -> str:
    """Return who lifts a piece, louder where one must not do it alone."""
    return "1 person" if n_persons == 1 else f"{n_persons} PERSONS"


def lifters(n_persons: int, middle: float, top: float, height: float, room: float) -> list[Mark]:
    """Return one person, or two with a load between them, round `middle`, with words below; words take `room` mm."""
    size = 0.8 * height / 10.0
    turn = np.linspace(0.0, 2.0 * np.pi, 16, endpoint=False)
    head = np.stack([np.cos(turn), np.sin(turn)], axis=1) * 1.35 + [0.0, 1.35]
    body = np.array(
        [[-1.9, 3.1], [1.9, 3.1], [1.9, 6.3], [1.2, 6.3], [1.2, 10.0], [0.15, 10.0], [0.15, 6.6],
         [-0.15, 6.6], [-0.15, 10.0], [-1.2, 10.0], [-1.2, 6.3], [-1.9, 6.3]]
    )  # fmt: skip
    marks: list[Mark] = []
    for shift in [0.0] if n_persons == 1 else [-4.5, 4.5]:
        for shape in (head, body):
            points = shape * size + np.array([middle + shift * size, top])
            marks.append(Polygon(points_mm=points, fill=INK, stroke="", width_mm=0.0))
    if n_persons > 1:
        load = box(middle - 2.2 * size, top + 4.2 * size, 4.4 * size, 2.4 * size)
        marks.append(Polygon(points_mm=load, fill="", width_mm=0.35))
    words = Text(
        x_mm=middle,
        y_mm=top + 1.06 * height,
        text=lift_words(n_persons),
        size_mm=0.18 * height,
        anchor="middle",
        is_bold=n_persons > 1,
        room_mm=room,
    )
    return [*marks, words]


def billet_plan(facts: TagFacts, left: float, top: float, width: float, height: float) -> list[Mark]:
    """Return the billet from above as it lies on the machine: travel, near edge and start edge, neighbours, outline."""
    sweep = facts.sweep
    top, height = top + _ABOVE_MM, height - _ABOVE_MM
    scale = min((width - _BESIDE_MM) / sweep.length_mm, (height - _BELOW_MM) / sweep.width_mm)
    length, depth = sweep.length_mm * scale, sweep.width_mm * scale
    x = left + _BESIDE_MM + (width - _BESIDE_MM - length) / 2.0
    y = top + (height - _BELOW_MM - depth) / 2.0
    middle_x, middle_y = x + length / 2.0, y + depth / 2.0
    marks: list[Mark] = [
        Polygon(
            points_mm=ring * np.array([scale, -scale]) + np.array([x, y + depth]), fill="", stroke=SOFT, width_mm=0.2
        )
        for ring in facts.outline
    ]
    marks += [
        Polygon(points_mm=box(x, y, length, depth), width_mm=0.35),
        Line(x1_mm=x, y1_mm=y + depth, x2_mm=x + length, y2_mm=y + depth, width_mm=1.0),
        _edge_name("NEAR", middle_x, y + depth + 3.0, room=max(length, 8.0)),
        _edge_name("START", x - 1.0, middle_y, room=max(depth, 8.0), turn=-90.0),
        *arrow(x + 0.25 * length, middle_y, x + 0.75 * length, middle_y),
        _caption("From above", middle_x, y - 0.9),
    ]
    west, south, east, north = (scale * gap for gap in _gaps(facts))
    if depth > 7.5:
        marks += _side_name(facts, "far", middle_x, y + north + 0.7 + _SMALL_MM, 0.8 * length, 0.0)
        marks += _side_name(facts, "near", middle_x, y + depth - max(south, 0.5) - 0.7, 0.8 * length, 0.0)
    if length > 12.0:
        marks += _side_name(facts, "start", x + west + 0.7 + _SMALL_MM, middle_y, 0.5 * depth, -90.0)
        marks += _side_name(facts, "end", x + length - east - 0.7 - _SMALL_MM, middle_y, 0.5 * depth, 90.0)
    return marks


def _gaps(facts: TagFacts) -> tuple[float, float, float, float]:
    """Return the narrow margins the panel's outline leaves in the billet at start, near, end and far, mm."""
    if not facts.outline:
        return (0.0, 0.0, 0.0, 0.0)
    sweep, points = facts.sweep, np.concatenate(facts.outline)
    (x1, y1), (x2, y2) = points.min(axis=0), points.max(axis=0)
    gaps = (x1, y1, sweep.length_mm - x2, sweep.width_mm - y2)
    most = 0.15 * min(sweep.length_mm, sweep.width_mm)
    start, near, end, far = (float(gap) if 0.0 < gap < most else 0.0 for gap in gaps)
    return start, near, end, far


def _edge_name(text: str, x: float, y: float, room: float, turn: float = 0.0) -> Text:
    return Text(
        x_mm=x, y_mm=y, text=text, size_mm=_LABEL_MM, anchor="middle", is_bold=True, room_mm=room, turn_deg=turn
    )


def _caption(text: str, x: float, y: float) -> Text:
    return Text(x_mm=x, y_mm=y, text=text, size_mm=1.3, anchor="middle", colour=SOFT)


def _side_name(facts: TagFacts, edge: str, x: float, y: float, room: float, turn: float) -> list[Mark]:
    text = facts.edges[edge].words
    if not text:
        return []
    return [
        Text(x_mm=x, y_mm=y, text=text, size_mm=_SMALL_MM, anchor="middle", room_mm=room, turn_deg=turn, colour=SOFT)
    ]


def billet_side(facts: TagFacts, left: float, top: float, width: float, height: float) -> list[Mark]:
    """Return the billet from its near side, not to scale: this half shaded with its letter, and which way was up."""
    sweep, is_lower = facts.sweep, facts.piece.half is Half.LOWER
    span = width - 4.5  # the arrow stands beside it
    inside = (sweep.near[:, 0] > 0.0) & (sweep.near[:, 0] < sweep.length_mm)
    stations = np.concatenate([[0.0], sweep.near[inside, 0], [sweep.length_mm]])
    stations = stations[np.linspace(0, len(stations) - 1, min(len(stations), 40)).astype(int)]
    heights = np.interp(stations, sweep.near[:, 0], sweep.near[:, 1])
    cut = np.stack([left + stations / sweep.length_mm * span, top + height * (1.0 - heights / sweep.height_mm)], axis=1)
    corners = box(left, top, span, height)
    lower, upper = np.vstack([cut, corners[[2, 3]]]), np.vstack([cut[::-1], corners[[0, 1]]])
    room = heights if is_lower else sweep.height_mm - heights
    # The letter stands where the half is thick, but not at its very end.
    best = int(np.argmax(np.where(np.abs(stations / sweep.length_mm - 0.5) < 0.34, room, -1.0)))
    edge = top + height if is_lower else top
    letter_y = (float(cut[best, 1]) + edge) / 2.0
    thickness = abs(float(cut[best, 1]) - edge)
    cap = min(3.0, 0.6 * thickness)
    return [
        Polygon(points_mm=upper, fill="" if is_lower else SHADE, width_mm=0.3),
        Polygon(points_mm=lower, fill=SHADE if is_lower else "", width_mm=0.3),
        Text(
            x_mm=float(cut[best, 0]),
            y_mm=letter_y + cap / 2.0,
            text="L" if is_lower else "U",
            size_mm=cap,
            anchor="middle",
            is_bold=True,
        ),
        _caption("From near", left + span / 2.0, top - 0.9),
        *arrow(left + span + 2.7, top + height, left + span + 2.7, top + 0.3),
        _edge_name("UP", left + span + 2.7, top + height + 3.0, room=4.5),
    ]
