"""Reads PLY through trimesh, after checking that the file can hold what its header promises."""

import io
import re

import numpy as np

from cutblock.base.errors import InputError
from cutblock.form.soup import Soup, check_count

_BYTES = {"char": 1, "uchar": 1, "short": 2, "ushort": 2, "int": 4, "uint": 4, "float": 4, "double": 8}
_BYTES |= {"int8": 1, "uint8": 1, "int16": 2, "uint16": 2, "int32": 4, "uint32": 4, "float32": 4, "float64": 8}
_EXPORT_AGAIN = "Export the mesh again; the file is damaged."


def read_ply(raw: bytes, name: str) -> Soup:
    """Return the triangles of a PLY file.

    Raises:
        InputError: The header and the rest do not agree, or the file cannot be read.
    """
    import trimesh

    end = raw.find(b"end_header")
    if not raw.startswith(b"ply") or end < 0:
        raise InputError("is no PLY file: its header does not begin or does not end", name, _EXPORT_AGAIN)
    header = raw[:end].decode("latin-1")
    counts = {
        kind: int(count) for kind, count in re.findall(r"^element\s+(\w+)\s+(\d{1,18})\s*$", header, re.MULTILINE)
    }
    n_vertices, n_faces = counts.get("vertex", 0), counts.get("face", 0)
    check_count(n_faces, name)
    least = _least_bytes(header)
    body = len(raw) - end
    if any(count * least.get(kind, 1) > body for kind, count in counts.items()):
        raise InputError(
            f"its header says {n_vertices} vertices and {n_faces} faces, more than its {len(raw)} bytes can hold",
            name,
            _EXPORT_AGAIN,
        )
    try:
        # No resolver is given, so that no other file is opened; nothing is merged or thrown away.
        mesh = trimesh.load_mesh(io.BytesIO(raw), file_type="ply", process=False, maintain_order=True)
        vertices = np.array(mesh.vertices, dtype=np.float64).reshape(-1, 3)
        triangles = np.array(mesh.faces, dtype=np.int64).reshape(-1, 3)
    except MemoryError:
        raise
    except Exception as error:  # the reader fails in five kinds of ways on damaged files
        raise InputError(f"cannot be read as PLY ({type(error).__name__})", name, _EXPORT_AGAIN) from error
    if len(vertices) != n_vertices or len(triangles) < n_faces:
        raise InputError(
            f"its header says {n_vertices} vertices and {n_faces} faces, the file holds {len(vertices)} and "
            f"{len(triangles)} that can be used",
            name,
            _EXPORT_AGAIN,
        )
    is_single = "double" not in header and "float64" not in header and "format ascii" not in header
    return Soup(vertices, triangles, None, is_single)


def _least_bytes(header: str) -> dict[str, int]:
    """Return the fewest bytes one of each element takes; in text every number takes two at least."""
    is_text = "format ascii" in header
    least: dict[str, int] = {}
    kind = ""
    for line in header.splitlines():
        words = line.split()
        if len(words) >= 2 and words[0] == "element":
            kind = words[1]
            least[kind] = 0
        elif len(words) >= 3 and words[0] == "property" and kind:
            # A list takes at least its count.
            least[kind] += 2 if is_text else _BYTES.get(words[2] if words[1] == "list" else words[1], 1)
    return least
