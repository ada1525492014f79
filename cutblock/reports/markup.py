"""Pieces of HTML; every text that enters is escaped here and nowhere else."""

from collections.abc import Iterable, Sequence
from html import escape

from cutblock.reports.figures import plain_text


def safe(text: str) -> str:
    """Return text as it stands in HTML, between tags or in quotes."""
    return escape(plain_text(text))


def section(title: str, body: str, kind: str = "") -> str:
    """Return a section under a heading; `body` is HTML."""
    mark = f' class="{safe(kind)}"' if kind else ""
    return f"<section{mark}>\n<h2>{safe(title)}</h2>\n{body}\n</section>\n"


def paragraph(text: str, kind: str = "") -> str:
    """Return one paragraph."""
    mark = f' class="{safe(kind)}"' if kind else ""
    return f"<p{mark}>{safe(text)}</p>\n"


def pairs(rows: Iterable[tuple[str, str]]) -> str:
    """Return a table of labels and values."""
    cells = "".join(f'<tr><th scope="row">{safe(label)}</th><td>{safe(value)}</td></tr>\n' for label, value in rows)
    return f'<table class="pairs"><tbody>\n{cells}</tbody></table>\n'


def table(
    heading: Sequence[str],
    rows: Sequence[Sequence[str]],
    numbers: Sequence[int] = (),
    kinds: Sequence[str] = (),
) -> str:
    """Return a table.

    Args:
        heading: One word or two for each column.
        rows: Texts; a row of one text is a heading over the rows that follow.
        numbers: Columns that are set flush right.
        kinds: A class for each row, where given.
    """
    head = "".join(_cell("th", column, word, numbers) for column, word in enumerate(heading))
    body = []
    for number, row in enumerate(rows):
        if len(row) == 1:
            body.append(f'<tr class="over"><th colspan="{len(heading)}" scope="rowgroup">{safe(row[0])}</th></tr>\n')
            continue
        kind = f' class="{safe(kinds[number])}"' if kinds and kinds[number] else ""
        cells = "".join(_cell("td", column, text, numbers) for column, text in enumerate(row))
        body.append(f"<tr{kind}>{cells}</tr>\n")
    return f"<table><thead><tr>{head}</tr></thead><tbody>\n{''.join(body)}</tbody></table>\n"


def _cell(tag: str, column: int, text: str, numbers: Sequence[int]) -> str:
    kind = ' class="number"' if column in numbers else ""
    scope = ' scope="col"' if tag == "th" else ""
    return f"<{tag}{scope}{kind}>{safe(text)}</{tag}>"
