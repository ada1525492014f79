"""On which line of a TOML text a key stands; the standard reader does not tell."""

import re

Path = tuple[str | int, ...]  # ("form", "face", 0, "corners")

_HEADER = re.compile(r"^\s*(\[\[?)\s*([^\]]+?)\s*\]\]?\s*(#.*)?$")
_KEY = re.compile(r"^\s*((?:\"[^\"]*\"|'[^']*'|[A-Za-z0-9_-]+)(?:\s*\.\s*(?:\"[^\"]*\"|'[^']*'|[A-Za-z0-9_-]+))*)\s*=")
_QUOTED = re.compile(r"\"(?:[^\"\\]|\\.)*\"|'[^']*'")


def key_lines(text: str) -> dict[Path, int]:
    """Return the line number, from 1, of every table header and every key at the start of a line.

    Args:
        text: A TOML document. Keys inside inline tables and multi-line strings are not listed.

    Returns:
        Lines by path; the n-th table of an array of tables has n - 1 in its path.
    """
    lines: dict[Path, int] = {}
    counts: dict[Path, int] = {}
    table: Path = ()
    depth = 0  # of brackets left open by a value that goes on over several lines
    fence = ""  # the quotes of a multi-line string that is still open
    for number, line in enumerate(text.splitlines(), start=1):
        if fence:
            if fence in line:
                fence = ""
            continue
        if depth == 0:
            header, key = _HEADER.match(line), _KEY.match(line)
            if header:
                table = _enter_table(_split(header[2]), header[1] == "[[", counts)
                lines.setdefault(table, number)
                continue
            if key:
                lines.setdefault((*table, *_split(key[1])), number)
        fence = _open_fence(line)
        bare = _QUOTED.sub("", line).split("#", 1)[0]
        depth = max(0, depth + sum(bare.count(c) for c in "[{") - sum(bare.count(c) for c in "]}"))
    return lines


def line_of(lines: dict[Path, int], path: Path) -> int:
    """Return the line of `path`, or of the nearest thing around it; 1 where nothing is known."""
    for end in range(len(path), 0, -1):
        if path[:end] in lines:
            return lines[path[:end]]
    return 1


def _split(dotted: str) -> Path:
    return tuple(part.strip().strip("\"'") for part in dotted.split("."))


def _enter_table(names: Path, is_array: bool, counts: dict[Path, int]) -> Path:
    path: Path = ()
    for name in names[:-1]:
        path = (*path, name)
        if path in counts:
            path = (*path, counts[path] - 1)
    path = (*path, names[-1])
    if is_array:
        counts[path] = counts.get(path, 0) + 1
        path = (*path, counts[path] - 1)
    return path


def _open_fence(line: str) -> str:
    for fence in ('"""', "'''"):
        if line.count(fence) % 2:
            return fence
    return ""
