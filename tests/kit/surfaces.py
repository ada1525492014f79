"""Surfaces for tests: jobs of one face, triangle meshes of height functions, and mesh files written by hand."""

import numpy as np
from kit.sample import sample_job

from cutblock.records.job import FaceSpec, MeshSource
from cutblock.records.words import Layup


def job_of(source, *, layup=Layup.BED, name="S", **changes):
    """A job of one face; keywords of FaceSpec and of Job may be mixed."""
    of_face = {
        key: changes.pop(key)
        for key in ("cell_mm", "cuts_x_mm", "cuts_y_mm", "count", "angle_rad", "phase_mm")
        if key in changes
    }
    return sample_job(
        layup=layup, faces=(FaceSpec(name=name, source=source, place="job.toml:12", **of_face),), **changes
    )


def mesh_job(path, **changes):
    return job_of(MeshSource(path=str(path)), **changes)


def grid_mesh(height, x, y):
    """Vertices and triangles of z = height(x, y), facing up."""
    grid_x, grid_y = np.meshgrid(np.asarray(x, float), np.asarray(y, float), indexing="ij")
    vertices = np.stack([grid_x, grid_y, height(grid_x, grid_y) + 0.0 * grid_x], axis=-1).reshape(-1, 3)
    number = np.arange(len(vertices)).reshape(grid_x.shape)
    a, b, c, d = (part.ravel() for part in (number[:-1, :-1], number[1:, :-1], number[1:, 1:], number[:-1, 1:]))
    return vertices, np.concatenate([np.stack([a, b, c], axis=1), np.stack([a, c, d], axis=1)])


def joined(*meshes):
    """Several meshes as one."""
    starts = np.cumsum([0, *(len(vertices) for vertices, _ in meshes)])
    return (
        np.concatenate([vertices for vertices, _ in meshes]),
        np.concatenate([triangles + start for (_, triangles), start in zip(meshes, starts[:-1], strict=True)]),
    )


def box_mesh(low, high):
    """A closed box, facing outwards."""
    (x, y, z), (X, Y, Z) = low, high
    vertices = np.array(
        [[x, y, z], [X, y, z], [X, Y, z], [x, Y, z], [x, y, Z], [X, y, Z], [X, Y, Z], [x, Y, Z]], dtype=float
    )
    quads = [[0, 3, 2, 1], [4, 5, 6, 7], [0, 1, 5, 4], [1, 2, 6, 5], [2, 3, 7, 6], [3, 0, 4, 7]]
    return vertices, np.array([[q[0], q[i], q[i + 1]] for q in quads for i in (1, 2)])


def slab_mesh(height, x, y, bottom):
    """A closed solid under z = height(x, y), facing outwards."""
    top, triangles = grid_mesh(height, x, y)
    n = len(top)
    starts, ends = triangles.ravel(), triangles[:, [1, 2, 0]].ravel()
    edges = set(zip(starts.tolist(), ends.tolist(), strict=True))
    rim = sorted(edge for edge in edges if edge[::-1] not in edges)
    walls = [(b, a, a + n) for a, b in rim] + [(b, a + n, b + n) for a, b in rim]
    floor = top.copy()
    floor[:, 2] = bottom
    return np.concatenate([top, floor]), np.concatenate([triangles, triangles[:, ::-1] + n, np.array(walls)])


def write_stl(path, mesh, count=None, head=b"", tail=b""):
    vertices, triangles = mesh
    records = np.zeros(len(triangles), dtype=[("normal", "<f4", 3), ("at", "<f4", (3, 3)), ("attribute", "<u2")])
    records["at"] = vertices[triangles]
    header = head.ljust(80, b" ") + np.uint32(len(triangles) if count is None else count).tobytes()
    path.write_bytes(header + records.tobytes() + tail)
    return path


def write_obj(path, mesh):
    vertices, triangles = mesh
    rows = [f"v {x!r} {y!r} {z!r}" for x, y, z in vertices.tolist()]
    rows += [f"f {a} {b} {c}" for a, b, c in (triangles + 1).tolist()]
    path.write_text("\n".join(rows) + "\n")
    return path
