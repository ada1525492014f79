"""A drawing as SVG text (W3C SVG 1.1), self-contained."""

import zlib
from html import escape

from cutblock.records.drawing import Drawing, Line, Mark, Modules, Polygon, Text
from cutblock.reports.figures import plain_text

CAP_HEIGHT = 0.72  # of a sans-serif face, in parts of the font size
_HATCHES = {
    "/": ("up", '<path d="M-1,1 l2,-2 M0,3 l3,-3 M2,4 l2,-2"/>'),
    "\\": ("down", '<path d="M-1,2 l2,2 M0,0 l3,3 M2,-1 l2,2"/>'),
    "x": ("cross", '<path d="M0,0 l3,3 M0,3 l3,-3"/>'),
    ".": (
        "dots",
        '<circle cx="0.75" cy="0.75" r="0.2" fill="#606060"/><circle cx="2.25" cy="2.25" r="0.2" fill="#606060"/>',
    ),
}
# Advance widths in parts of the font size: Helvetica's (Adobe font metrics), letters of about one width together.
_WIDTHS = {
    letter: width
    for width, letters in (
        (0.25, "ijl'| .,:;!I/"),
        (0.34, 'ftr()[]-"*'),
        (0.50, "ckszJvxy"),
        (0.67, "ABEKPSVXYFTZL&"),
        (0.73, "CDHNRUw"),
        (0.78, "GOQ"),
        (0.85, "Mm%"),
        (0.95, "W@"),
    )
    for letter in letters
}
_OTHER_WIDTH = 0.57
_SURE = 1.12  # other sans-serif faces run wider, and which one a reader has is not known
_BOLD = 1.06


def svg_text(drawing: Drawing) -> str:
    """Return a drawing as an SVG element of its size in mm, as wide as the room it is given.

    Text that a painter would shrink to fit is shrunk by an estimate of its width, since the reader's font is not known.
    """
    # A page holds many drawings: the names of their hatches must differ.
    key = f"h{zlib.crc32(repr((drawing.title, len(drawing.marks))).encode()):08x}"
    body = "\n".join(_mark(mark, key) for mark in drawing.marks)
    size = f"{_number(drawing.width_mm)} {_number(drawing.height_mm)}"
    title = f"<title>{_safe(drawing.title)}</title>\n" if drawing.title else ""
    return (
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {size}" width="{_number(drawing.width_mm)}mm"'
        f' height="{_number(drawing.height_mm)}mm" role="img" font-family="Helvetica, Arial, sans-serif">\n'
        f"{title}{_patterns(drawing, key)}{body}\n</svg>"
    )


def _patterns(drawing: Drawing, key: str) -> str:
    used = sorted({mark.hatch for mark in drawing.marks if isinstance(mark, Polygon) and mark.hatch})
    if not used:
        return ""
    patterns = "".join(
        f'<pattern id="{key}-{_HATCHES[hatch][0]}" width="3" height="3" patternUnits="userSpaceOnUse"'
        f' stroke="#606060" stroke-width="0.2" fill="none">{_HATCHES[hatch][1]}</pattern>'
        for hatch in used
    )
    return f"<defs>{patterns}</defs>\n"


def _mark(mark: Mark, key: str) -> str:
    match mark:
        case Line():
            return _line(mark)
        case Polygon():
            return _polygon(mark, key)
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


def _polygon(mark: Polygon, key: str) -> str:
    points = " ".join(f"{_number(x)},{_number(y)}" for x, y in mark.points_mm.tolist())
    stroke = f'stroke="{mark.stroke or "none"}" stroke-width="{_number(mark.width_mm)}"'
    title = f"<title>{_safe(mark.title)}</title>" if mark.title else ""
    shapes = [f'<polygon points="{points}" fill="{mark.fill or "none"}" {stroke}>{title}</polygon>']
    if mark.hatch:
        shapes.append(
            f'<polygon points="{points}" fill="url(#{key}-{_HATCHES[mark.hatch][0]})" stroke="none">{title}</polygon>'
        )
    return "".join(shapes)


def _text(mark: Text) -> str:
    size = mark.size_mm / CAP_HEIGHT
    width = text_width(mark.text, size, mark.is_bold)
    if 0.0 < mark.room_mm < width:
        size *= mark.room_mm / width
    weight = ' font-weight="bold"' if mark.is_bold else ""
    turn = f"rotate({_number(mark.turn_deg)} {_number(mark.x_mm)} {_number(mark.y_mm)})"
    transform = f' transform="{turn}"' if mark.turn_deg else ""
    return (
        f'<text x="{_number(mark.x_mm)}" y="{_number(mark.y_mm)}" font-size="{_number(size)}" fill="{mark.colour}"'
        f' text-anchor="{mark.anchor}"{weight}{transform}>{_safe(mark.text)}</text>'
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


def text_width(text: str, font_size: float, is_bold: bool = False) -> float:
    """Return about how wide a text runs in a sans-serif face, rather too wide than too narrow."""
    width = sum(_WIDTHS.get(letter, _OTHER_WIDTH) for letter in text)
    return width * font_size * _SURE * (_BOLD if is_bold else 1.0)


def _safe(text: str) -> str:
    return escape(plain_text(text))


def _number(value: float) -> str:
    text = f"{value:.4f}".rstrip("0").rstrip(".")
    return "0" if text in {"-0", ""} else text
