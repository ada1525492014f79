"""Mesh files of named bodies, in the formats other programs read; lengths stay mm wherever the format can say so."""

import json
import struct
import zipfile
from collections.abc import Iterable, Sequence
from typing import IO
from xml.sax.saxutils import quoteattr

import numpy as np

from cutblock.base.arrays import Floats, Ints
from cutblock.halves.bodies import Body

_MM_PER_M = 1000.0
_Z_UP_TO_Y_UP = (-(0.5**0.5), 0.0, 0.0, 0.5**0.5)  # quaternion x, y, z, w: a quarter turn about x
_ZIP_TIME = (1980, 1, 1, 0, 0, 0)  # the earliest a ZIP can say, so that the same bodies give the same bytes

_CONTENT_TYPES = """<?xml version="1.0" encoding="UTF-8"?>
<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">
<Default Extension="rels" ContentType="application/vnd.openxmlformats-package.relationships+xml"/>
<Default Extension="model" ContentType="application/vnd.ms-package.3dmanufacturing-3dmodel+xml"/>
</Types>
"""
_RELATIONSHIPS = """<?xml version="1.0" encoding="UTF-8"?>
<Relationships xmlns="http://schemas.openxmlformats.org/package/2006/relationships">
<Relationship Target="/3D/3dmodel.model" Id="rel0" Type="http://schemas.microsoft.com/3dmanufacturing/2013/01/3dmodel"/>
</Relationships>
"""
_MODEL_HEAD = """<?xml version="1.0" encoding="UTF-8"?>
<model unit="millimeter" xml:lang="en" xmlns="http://schemas.microsoft.com/3dmanufacturing/core/2015/02">
"""


def write_stl(file: IO[bytes], body: Body, shift_mm: Sequence[float]) -> None:
    """Write one body as binary STL; the 80-byte header says its name, mm and the shift.

    Coordinates are 32-bit floats. Facets whose corners fall together in them are left out, which keeps a closed mesh
    closed.

    Args:
        file: Where to.
        body: Closed or open.
        shift_mm: Whole mm taken off x, y, z, so that bodies far from the origin lose no digits.
    """
    vertices = (body.mesh.vertices - np.asarray(shift_mm)).astype("<f4") + np.float32(0.0)
    corners = vertices[body.mesh.triangles]
    is_facet = (corners != np.roll(corners, 1, axis=1)).any(axis=2).all(axis=1)
    corners = corners[is_facet]
    facets = np.zeros(len(corners), dtype=[("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("spare", "<u2")])
    facets["normal"] = _unit_normals(corners.astype(np.float64))
    facets["corners"] = corners
    place = " ".join(f"{value:+.0f}" for value in shift_mm)
    file.write(f"cutblock {body.name} unit mm, shifted by {place}".encode("ascii", "replace")[:80].ljust(80))
    file.write(struct.pack("<I", len(facets)))
    file.write(facets.tobytes())


def _unit_normals(corners: Floats) -> Floats:
    normals = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
    lengths = np.linalg.norm(normals, axis=1, keepdims=True)
    units: Floats = np.divide(normals, lengths, out=np.zeros_like(normals), where=lengths > 0.0)
    return units


def write_ply(file: IO[bytes], body: Body) -> None:
    """Write one body as binary PLY with 64-bit coordinates; comments say its name and mm."""
    vertices, triangles = body.mesh
    header = (
        f"ply\nformat binary_little_endian 1.0\ncomment cutblock {body.name}\ncomment unit mm\n"
        f"element vertex {len(vertices)}\nproperty double x\nproperty double y\nproperty double z\n"
        f"element face {len(triangles)}\nproperty list uchar int vertex_indices\nend_header\n"
    )
    faces = np.zeros(len(triangles), dtype=[("count", "u1"), ("rows", "<i4", 3)])
    faces["count"] = 3
    faces["rows"] = triangles
    file.write(header.encode("utf-8"))
    file.write(vertices.astype("<f8").tobytes())
    file.write(faces.tobytes())


def write_obj(file: IO[bytes], bodies: Iterable[Body]) -> None:
    """Write bodies as OBJ text, each an object and a group of its name; the first comment says mm."""
    file.write(b"# cutblock\n# unit mm\n")
    first = 1  # OBJ counts vertices from 1, over all objects
    for body in bodies:
        vertices, triangles = body.mesh
        file.write(f"o {body.name}\ng {body.name}\n".encode())
        file.write(_rows("v %.6f %.6f %.6f\n", vertices))
        file.write("".join("f %d %d %d\n" % row for row in map(tuple, (triangles + first).tolist())).encode())  # noqa: UP031 - much quicker on a row
        first += len(vertices)


def write_3mf(file: IO[bytes], bodies: Iterable[Body]) -> None:
    """Write bodies as 3MF (core specification 1.2) in millimetres, each an object of its name.

    An open mesh is an object of type "surface", which may stand outside solids.
    """
    with zipfile.ZipFile(file, "w", zipfile.ZIP_DEFLATED) as package:
        for name, text in (("[Content_Types].xml", _CONTENT_TYPES), ("_rels/.rels", _RELATIONSHIPS)):
            package.writestr(_entry(name), text)
        with package.open(_entry("3D/3dmodel.model"), "w", force_zip64=True) as model:
            model.write(f'{_MODEL_HEAD}<metadata name="Application">cutblock</metadata>\n<resources>\n'.encode())
            count = 0
            for body in bodies:
                count += 1
                kind = "model" if body.is_closed else "surface"
                model.write(f'<object id="{count}" type="{kind}" name={quoteattr(body.name)}><mesh>\n'.encode())
                model.write(b"<vertices>\n" + _rows('<vertex x="%.6f" y="%.6f" z="%.6f"/>\n', body.mesh.vertices))
                model.write(b"</vertices>\n<triangles>\n")
                rows = map(tuple, body.mesh.triangles.tolist())
                model.write("".join('<triangle v1="%d" v2="%d" v3="%d"/>\n' % row for row in rows).encode())  # noqa: UP031 - as above
                model.write(b"</triangles>\n</mesh></object>\n")
            items = "".join(f'<item objectid="{number}"/>\n' for number in range(1, count + 1))
            model.write(f"</resources>\n<build>\n{items}</build>\n</model>\n".encode())


def _entry(name: str) -> zipfile.ZipInfo:
    entry = zipfile.ZipInfo(name, _ZIP_TIME)
    entry.compress_type = zipfile.ZIP_DEFLATED
    return entry


def _rows(template: str, vertices: Floats) -> bytes:
    """Return one line a vertex; the template has three numbers of six decimals."""
    rounded = np.round(vertices, 6) + 0.0  # never -0
    return "".join([template % tuple(row) for row in rounded.tolist()]).encode("ascii")


def write_glb(file: IO[bytes], bodies: Iterable[Body]) -> None:
    """Write bodies as binary glTF 2.0, each a node and a mesh of its name.

    The specification fixes metres and y up: coordinates are divided by 1000 and a root node turns z up. Each body's
    32-bit coordinates are about a place of its own, which its node puts back.
    """
    nodes, meshes, accessors, views = [], [], [], []
    chunks: list[bytes] = []
    length = 0

    def add(array: Floats | Ints, target: int, **facts: object) -> int:
        nonlocal length
        raw = array.tobytes()
        views.append({"buffer": 0, "byteOffset": length, "byteLength": len(raw), "target": target})
        accessors.append(
            {"bufferView": len(views) - 1, "count": array.size if array.ndim == 1 else len(array), **facts}
        )
        chunks.append(raw)
        length += len(raw)
        return len(accessors) - 1

    for body in bodies:
        centre = np.round((body.mesh.vertices.min(axis=0) + body.mesh.vertices.max(axis=0)) / 2.0)
        points = ((body.mesh.vertices - centre) / _MM_PER_M).astype("<f4")
        lowest, highest = points.min(axis=0).tolist(), points.max(axis=0).tolist()
        position = add(points, 34962, componentType=5126, type="VEC3", min=lowest, max=highest)
        indices = add(body.mesh.triangles.astype("<u4").ravel(), 34963, componentType=5125, type="SCALAR")
        primitive = {"attributes": {"POSITION": position}, "indices": indices, "material": 0}
        meshes.append({"name": body.name, "primitives": [primitive]})
        nodes.append({"name": body.name, "mesh": len(meshes) - 1, "translation": (centre / _MM_PER_M).tolist()})
    root = {"name": "cutblock", "rotation": _Z_UP_TO_Y_UP, "children": list(range(1, len(nodes) + 1))}
    head = {
        "asset": {"version": "2.0", "generator": "cutblock"},
        "scene": 0,
        "scenes": [{"nodes": [0]}],
        "nodes": [root, *nodes],
        "meshes": meshes,
        "materials": [{"name": "foam", "doubleSided": True}],
        "accessors": accessors,
        "bufferViews": views,
        "buffers": [{"byteLength": length}],
    }
    text = json.dumps(head, separators=(",", ":")).encode("utf-8")
    text += b" " * (-len(text) % 4)
    file.write(struct.pack("<4sII", b"glTF", 2, 12 + 8 + len(text) + 8 + length))
    file.write(struct.pack("<I4s", len(text), b"JSON") + text)
    file.write(struct.pack("<I4s", length, b"BIN\0"))
    for chunk in chunks:
        file.write(chunk)
