"""A drawing as SVG text (W3C SVG 1.1), self-contained."""

from html import escape

from cutblock.records.drawing import Drawing, Line, Mark, Modules, Polygon, Text

_CAP_HEIGHT = 0.72  # of a sans-serif face, in parts of the font size
_LETTER_WIDTH = 0.56  # likewise, of a letter on average
_HATCHES = {
    "/": '<path d="M-1,1 l2,-2 M0,3 l3,-3 M2,4 l2,-2"/>',
    "\\": '<path d="M-1,2 l2,2 M0,0 l3,3 M2,-1 l2,2"/>',
    "x": '<path d="M0,0 l3,3 M0,3 l3,-3"/>',
    ".": '<circle cx="0.75" cy="0.75" r="0.3" fill="#606060"/>',
}
_HATCH_NAMES = {"/": "up", "\\": "down", "x": "cross", ".": "dots"}


def svg_text(drawing: Drawing) -> str:
    """Return a drawing as an SVG element of its size in mm."""
    body = "\n".join(_mark(mark) for mark in drawing.marks)
    size = f"{_number(drawing.width_mm)} {_number(drawing.height_mm)}"
    title = f"<title>{escape(drawing.title)}</title>\n" if drawing.title else ""
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {size}" width="{_number(drawing.width_mm)}mm"'
        f' height="{_number(drawing.height_mm)}mm" role="img" font-family="Helvetica, Arial, sans-serif">\n'
        f"{title}{_patterns(drawing)}{body}\n</svg>"
    )


def _patterns(drawing: Drawing) -> str:
    used = sorted({mark.hatch for mark in drawing.marks if isinstance(mark, Polygon) and mark.hatch})
    if not used:
        return ""
    patterns = "".join(
        f'<pattern id="hatch-{_HATCH_NAMES[hatch]}" width="3" height="3" patternUnits="userSpaceOnUse"'
        f' stroke="#606060" stroke-width="0.2">{_HATCHES[hatch]}</pattern>'
        for hatch in used
    )
    return f"<defs>{patterns}</defs>\n"


def _mark(mark: Mark) -> str:
    match mark:
        case Line():
            return _line(mark)
        case Polygon():
            return _polygon(mark)
        case Text():
            return _text(mark)
        case Modules():
            return _modules(mark)


def _line(mark: Line) -> str:
    dash = ' stroke-dasharray="1.2 0.8"' if mark.is_dashed else ""
    return (
        f'<line x1="{_number(mark.x1_mm)}" y1="{_number(mark.y1_mm)}" x2="{_number(mark.x2_mm)}"'
        f' y2="{_number(mark.y2_mm)}" stroke="{mark.colour}" stroke-width="{_number(mark.width_mm)}"{dash}/>'
    )


def _polygon(mark: Polygon) -> str:
    points = " ".join(f"{_number(x)},{_number(y)}" for x, y in mark.points_mm.tolist())
    stroke = f'stroke="{mark.stroke or "none"}" stroke-width="{_number(mark.width_mm)}"'
    title = f"<title>{escape(mark.title)}</title>" if mark.title else ""
    shapes = [f'<polygon points="{points}" fill="{mark.fill or "none"}" {stroke}>{title}</polygon>']
    if mark.hatch:
        shapes.append(
            f'<polygon points="{points}" fill="url(#hatch-{_HATCH_NAMES[mark.hatch]})" stroke="none">{title}</polygon>'
        )
    return "".join(shapes)


def _text(mark: Text) -> str:
    size = mark.size_mm / _CAP_HEIGHT
    width = len(mark.text) * size * _LETTER_WIDTH
    if 0.0 < mark.room_mm < width:
        size *= mark.room_mm / width
    weight = ' font-weight="bold"' if mark.is_bold else ""
    turn = f"rotate({_number(mark.turn_deg)} {_number(mark.x_mm)} {_number(mark.y_mm)})"
    transform = f' transform="{turn}"' if mark.turn_deg else ""
    return (
        f'<text x="{_number(mark.x_mm)}" y="{_number(mark.y_mm)}" font-size="{_number(size)}" fill="{mark.colour}"'
        f' text-anchor="{mark.anchor}"{weight}{transform}>{escape(mark.text)}</text>'
    )


def _modules(mark: Modules) -> str:
    module = mark.side_mm / len(mark.rows)
    squares = "".join(
        f"M{_number(mark.x_mm + column * module)},{_number(mark.y_mm + row * module)}"
        f"h{_number(module)}v{_number(module)}h{_number(-module)}z"
        for row, modules in enumerate(mark.rows)
        for column, is_dark in enumerate(modules)
        if is_dark == "1"
    )
    return f'<path d="{squares}" fill="#000000" shape-rendering="crispEdges"/>'


def _number(value: float) -> str:
    text = f"{value:.4f}".rstrip("0").rstrip(".")
    return "0" if text in {"-0", ""} else text
