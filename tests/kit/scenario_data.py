"""Makes the data files of the shipped scenarios; run as `python tests/kit/scenario_data.py` from the repository."""

from pathlib import Path

import numpy as np

SCENARIOS = Path(__file__).parents[2] / "scenarios"
MM_PER_INCH = 25.4


def tower_ring(radius_m, height_m, turn_deg):
    """Rows x, y, z of a closed ring, one row a degree, rounded to 1e-7 m."""
    angles = np.radians(np.arange(361) + turn_deg)
    rows = np.column_stack([radius_m * np.cos(angles), radius_m * np.sin(angles), np.full(361, height_m)])
    rows[-1] = rows[0]
    return rows


def ring_text(rows):
    return "x,y,z\n" + "".join(f"{x:.7f},{y:.7f},{z:.7f}\n" for x, y, z in rows + 0.0)


def ramp_helix(radius_mm):
    """Rows x, y, z of one turn of a helix that climbs 3 m, a row a degree, mm."""
    angles = np.radians(np.arange(361))
    return np.column_stack([radius_mm * np.cos(angles), radius_mm * np.sin(angles), 3000.0 * angles / (2 * np.pi)])


def reflector_triangles():
    """(n, 3, 3) triangles of twenty separate sheets, inches."""
    generator = np.random.default_rng(20)
    sheets = []
    for index in range(20):
        column, row = index % 5, index // 5
        length, width = generator.uniform(900, 1080), generator.uniform(680, 760)
        radius_x, radius_y = (
            (generator.uniform(3500, 5000), generator.uniform(3000, 4500)),  # dome
            (generator.uniform(2500, 4000), -generator.uniform(2500, 4000)),  # saddle
            (generator.uniform(40000, 60000), generator.uniform(2200, 3200)),  # nearly a cylinder
        )[index % 3]
        x, y = np.meshgrid(
            np.linspace(-length / 2, length / 2, 29), np.linspace(-width / 2, width / 2, 21), indexing="ij"
        )
        sway = generator.uniform(-6, 6) * (2 * x / length) * (2 * y / width) ** 2
        points = np.stack([x, y, -(x**2) / (2 * radius_x) - y**2 / (2 * radius_y) + sway], axis=-1)
        tilt_x, tilt_y, spin = np.radians(generator.uniform([-12, -12, -8], [12, 12, 8]))
        placed = points @ turn(0, tilt_x).T @ turn(1, tilt_y).T @ turn(2, spin).T
        placed += [column * 1400.0, row * 1100.0, 5200.0 + 60.0 * generator.uniform(-1, 1)]
        a, b, c, d = placed[:-1, :-1], placed[1:, :-1], placed[1:, 1:], placed[:-1, 1:]
        sheets += [np.stack(corners, axis=-2).reshape(-1, 3, 3) for corners in ((a, b, c), (a, c, d))]
    return np.concatenate(sheets) / MM_PER_INCH


def turn(axis, angle):
    """Rotation matrix about a coordinate axis."""
    i, j = [(1, 2), (2, 0), (0, 1)][axis]
    matrix = np.eye(3)
    matrix[[i, j], [i, j]] = np.cos(angle)
    matrix[i, j], matrix[j, i] = -np.sin(angle), np.sin(angle)
    return matrix


def valley_roof():
    """Rows x, y, z of a free-form roof with a valley, mm, every 250 mm over 12 m by 10 m."""
    x, y = np.meshgrid(np.arange(0.0, 12001.0, 250.0), np.arange(0.0, 10001.0, 250.0), indexing="ij")
    z = np.full(x.shape, 600.0)
    # Amplitude, periods along x and y, phase in degrees.
    for amplitude, along_x, along_y, phase in (
        (97, -14600, -17400, 33),
        (53, 35000, 15300, 20),
        (79, -15600, 22200, 54),
        (70, -52000, 20700, 228),
        (60, 7500, 19100, 67),
        (102, -22700, 316000, 279),
    ):
        z += amplitude * np.sin(2 * np.pi * (x / along_x + y / along_y) + np.radians(phase))
    return np.column_stack([x.ravel(), y.ravel(), z.ravel()])


def rows_text(rows):
    return "x,y,z\n" + "".join(f"{x:.0f},{y:.0f},{z:.3f}\n" for x, y, z in rows)


def binary_stl(triangles):
    """The bytes of a binary STL file; the normals are left to the reader."""
    record = np.zeros(len(triangles), dtype=[("normal", "<f4", 3), ("corners", "<f4", (3, 3)), ("mark", "<u2")])
    record["corners"] = triangles
    header = b"Twenty reflector sheets, inches".ljust(80)
    return header + np.uint32(len(triangles)).tobytes() + record.tobytes()


def files():
    """Content by path under scenarios/."""
    return {
        "tower-jacket/lower-ring.csv": ring_text(tower_ring(5.2, 0.0, 0.0)).encode(),
        "tower-jacket/upper-ring.csv": ring_text(tower_ring(4.4, 7.2, 40.0)).encode(),
        "valley-roof/heights.csv": rows_text(valley_roof()).encode(),
        "ramp-soffit/inner-helix.csv": ring_text(ramp_helix(5000.0)).encode(),
        "ramp-soffit/outer-helix.csv": ring_text(ramp_helix(8000.0)).encode(),
        "hall-reflectors/reflectors.stl": binary_stl(reflector_triangles()),
    }


if __name__ == "__main__":
    for name, content in files().items():
        (SCENARIOS / name).write_bytes(content)
