"""Mesh files read again by trimesh, an independent reader of STL, OBJ, PLY, 3MF and glTF: bodies by name, mm, z up."""

from itertools import pairwise

import numpy as np
import trimesh


def read_again(target, file_format):
    if target.is_dir():
        bodies = {path.stem: trimesh.load_mesh(path) for path in sorted(target.glob(f"*.{file_format}"))}
        lines = (target / "parts.csv").read_text().splitlines()[1:]
        assert sorted(line.split(",")[0] for line in lines) == sorted(bodies)
        for line in lines:
            bodies[line.split(",")[0]].apply_translation([float(value) for value in line.split(",")[-3:]])
        return bodies
    if file_format == "obj":
        return read_obj(target)
    scene = trimesh.load_scene(target)
    bodies = {}
    for node in scene.graph.nodes_geometry:
        matrix, geometry = scene.graph[node]
        mesh = scene.geometry[geometry].copy()
        mesh.apply_transform(matrix)
        if file_format == "glb":
            mesh.apply_transform(trimesh.transformations.rotation_matrix(np.pi / 2, [1, 0, 0]))
            mesh.apply_scale(1000.0)
        bodies[geometry] = mesh
    return bodies


def read_obj(target):
    """One object after another; the reader names none of them."""
    lines = target.read_text().splitlines()
    assert "# unit mm" in lines[:3]
    names = [line[2:] for line in lines if line.startswith("o ")]
    starts = [row for row, line in enumerate(lines) if line.startswith("o ")] + [len(lines)]
    vertices = [line for line in lines if line.startswith("v ")]
    bodies = {}
    for name, (start, end) in zip(names, pairwise(starts), strict=True):
        faces = [line for line in lines[start:end] if line.startswith("f ")]
        text = "\n".join([*vertices, *faces])
        bodies[name] = trimesh.load_mesh(trimesh.util.wrap_as_stream(text), file_type="obj")
    return bodies
