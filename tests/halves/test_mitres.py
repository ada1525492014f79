from dataclasses import replace

import manifold3d
import numpy as np
import pytest
from kit.sample import sample_job, sample_panel, sample_pieces, sample_sweep

import cutblock
from cutblock.base.errors import GeometryError, InputError
from cutblock.flow.folder import read_plan
from cutblock.geometry.solids import mesh_volume, split_billet
from cutblock.halves.bodies import half_bodies
from cutblock.halves.joints import side_planes
from cutblock.halves.mitres import find_mitres, mitred
from cutblock.halves.places import placed, poses_in_form
from cutblock.records.panel import PanelEdge
from cutblock.records.words import Duty, Half, Layup

# A level face, a roof fold of 20 degrees at its east, a valley fold of 40 degrees at its west.
ROOF, VALLEY = np.radians([20.0, 40.0])
MARGIN, THICKNESS = 40.0, 30.0
T_X, T_Z = 600.0 + 500.0 * np.cos(ROOF), -500.0 * np.sin(ROOF)
R_X, R_Z = -450.0 * np.cos(VALLEY), 450.0 * np.sin(VALLEY)
JOB = """\
format = 1
[job]
id = "MT"
title = "Folded"
units = "mm"
[form]
layup = "bench"
tolerance = 2.0
margin = {margin}
{faces}
[foam]
density = 20
[[foam.block]]
length = 2000
width = 1300
height = 600
[cutting]
machine = "four-axis-1300"
wire = "NiCr80 0.40"
power = 60
kerf = 1.2
wall = {wall}
[duties]
unpaired = "counter-mould"
thickness = {thickness}
"""
FACE = """\
[[form.face]]
name = "{name}"
corners = [[{x1}, 0, {z1}], [{x2}, 0, {z2}], [{x2}, 400, {z2}], [{x1}, 400, {z1}]]
"""
FOLDED = "".join(
    FACE.format(name=name, x1=x1, z1=z1, x2=x2, z2=z2)
    for name, x1, z1, x2, z2 in (
        ("S", 0.0, 0.0, 600.0, 0.0),
        ("T", 600.0, 0.0, T_X, T_Z),
        ("R", R_X, R_Z, 0.0, 0.0),
    )
)
SADDLE = """\
[[form.face]]
name = "S"
corners = [[0, 0, 500], [1400, 0, 0], [1400, 1200, 500], [0, 1200, 0]]
panels = { length = 760, width = 660 }
"""


def plan_of(folder, faces, wall):
    (folder / "job.toml").write_text(JOB.format(margin=MARGIN, faces=faces, wall=wall, thickness=THICKNESS))
    plan = cutblock.make_plan(cutblock.read_job(folder / "job.toml"))
    cutblock.write_plan(plan, folder / "plan")
    return read_plan(folder / "plan")


@pytest.fixture(scope="module")
def folded(tmp_path_factory):
    return plan_of(tmp_path_factory.mktemp("folded"), FOLDED, 120)


@pytest.fixture(scope="module")
def saddle(tmp_path_factory):
    return plan_of(tmp_path_factory.mktemp("saddle"), SADDLE, 60)


def mitres_of(plan, **changes):
    return find_mitres(replace(plan.job, **changes), plan.panels, plan.sweeps, plan.pieces)


def cut(plan):
    """The mitred halves by their ids, in the frames of their billets."""
    bodies = half_bodies(plan.job.layup, plan.panels, plan.sweeps, plan.pieces)
    return {body.name: body.mesh for body in mitred(bodies, mitres_of(plan))}


def degrees(plan, piece):
    return {side.edge: side.mitre_deg for side in mitres_of(plan)[piece].sides}


def test_faces_that_meet_at_an_angle_get_half_of_it_each_and_free_edges_stay_square(folded):
    lower, upper = degrees(folded, "MT-S-A01-L"), degrees(folded, "MT-S-A01-U")

    assert lower == pytest.approx({"south": 0.0, "east": -10.0, "north": 0.0, "west": 20.0}, abs=1e-6)
    # Its counter-mould stands on the other side of the face, so it narrows where the mould widens.
    assert upper == pytest.approx({"south": 0.0, "east": 10.0, "north": 0.0, "west": -20.0}, abs=1e-6)
    assert degrees(folded, "MT-T-A01-L")["west"] == pytest.approx(-10.0, abs=1e-6)
    assert degrees(folded, "MT-R-A01-L")["east"] == pytest.approx(20.0, abs=1e-6)


def test_the_table_says_what_each_side_joins_and_where_its_cut_meets_the_flat_back(folded):
    sides = {side.edge: side for side in mitres_of(folded)["MT-S-A01-L"].sides}

    assert {edge: side.joins for edge, side in sides.items()} == {
        "south": "",
        "east": "T-A01",
        "north": "",
        "west": "R-A01",
    }
    assert sides["east"].length_mm == pytest.approx(400.0)
    sweep = next(sweep for sweep in folded.sweeps if sweep.id == "MT-S-A01")
    face_mm = sweep.near[0, 1]
    x1, y1, x2, y2 = sides["east"].back_mm
    assert x1 == pytest.approx(x2)
    assert x1 == pytest.approx(MARGIN + 600.0 - face_mm * np.tan(ROOF / 2.0), abs=0.5)
    assert sorted((y1, y2)) == pytest.approx([MARGIN, MARGIN + 400.0], abs=0.5)


def test_a_side_that_runs_out_of_its_billet_is_told(folded):
    sides = {side.edge: side.is_whole for side in mitres_of(folded)["MT-S-A01-L"].sides}

    # 120 mm of foam and 20 degrees want 44 mm beside the panel; the margin is 40.
    assert sides == {"south": True, "east": True, "north": True, "west": False}


def test_a_flat_mould_and_its_counter_mould_have_the_volume_between_their_planes(folded):
    halves = cut(folded)
    sweep = next(sweep for sweep in folded.sweeps if sweep.id == "MT-S-A01")
    half_kerf = sweep.kerf_mm[0] / 2.0
    below = sweep.near[0, 1] - half_kerf
    above = sweep.height_mm - sweep.near[0, 1] - half_kerf
    roof, valley = np.tan(ROOF / 2.0), np.tan(VALLEY / 2.0)

    # Heights z over the form: the mould from -below to 0, the counter-mould lifted by the concrete's thickness.
    def between(low, high):
        z = np.linspace(low, high, 200_001)
        wide = 600.0 + z * roof + np.minimum(-z * valley, MARGIN)
        return 400.0 * np.trapezoid(wide, z)

    # With the kerf shared the wire runs on the form, so each face lies half the kerf off it.
    assert mesh_volume(halves["MT-S-A01-L"]) == pytest.approx(between(-half_kerf - below, -half_kerf), rel=1e-6)
    low = THICKNESS + half_kerf
    assert mesh_volume(halves["MT-S-A01-U"]) == pytest.approx(between(low, low + above), rel=1e-6)


def test_both_panels_at_a_joint_get_one_and_the_same_plane(saddle):
    panels = {panel.id: panel for panel in saddle.panels}
    planes = side_planes(saddle.panels)

    n_joints = 0
    for name, sides in planes.items():
        for edge, normal, distance, other in zip(
            panels[name].edges, sides.normals, sides.distances_mm, sides.joins, strict=True
        ):
            assert abs(normal @ edge.normal) < 1e-6
            if other:
                row = planes[other].joins.index(name)
                assert (planes[other].normals[row] == -normal).all()
                assert planes[other].distances_mm[row] == -distance
                n_joints += 1
    assert n_joints == 8


def test_moulds_side_by_side_meet_without_a_gap_and_without_running_into_each_other(saddle):
    """manifold3d as judge: neighbours share no volume, and grown by 0.01 mm across the joint they share its face."""
    bodies = half_bodies(saddle.job.layup, saddle.panels, saddle.sweeps, saddle.pieces)
    poses = poses_in_form(saddle.panels, saddle.sweeps, saddle.pieces, THICKNESS)
    meshes = {body.name: body.mesh for body in placed(mitred(bodies, mitres_of(saddle)), poses)}
    moulds = {piece.panel: meshes[piece.id] for piece in saddle.pieces if piece.duty is Duty.MOULD}
    planes = side_planes(saddle.panels)
    depth = min(sweep.height_mm for sweep in saddle.sweeps) / 2.0

    for name, mesh in moulds.items():
        for normal, other in zip(planes[name].normals, planes[name].joins, strict=True):
            if other:
                solids = [
                    manifold3d.Manifold(manifold3d.Mesh64(some.vertices, some.triangles.astype(np.uint64)))
                    for some in (mesh, moulds[other])
                ]
                assert (solids[0] ^ solids[1]).volume() < 1.0
                pressed = solids[0].translate(tuple(-0.01 * normal)) ^ solids[1]
                assert pressed.volume() > 0.01 * 600.0 * depth * 0.5


def test_the_two_mitres_at_a_joint_add_up_to_the_turn_of_the_panels_about_it(saddle):
    """Seen along the joint: the turn from one panel's normal to the other's is what both sides share."""
    panels = {panel.id: panel for panel in saddle.panels}
    moulds = {piece.panel: piece.id for piece in saddle.pieces if piece.duty is Duty.MOULD}
    mitres = mitres_of(saddle)
    assert len(moulds) == 4

    largest = 0.0
    for name, piece in moulds.items():
        for side in mitres[piece].sides:
            if not side.joins:
                continue
            edge = next(edge for edge in panels[name].edges if edge.name == side.edge)
            chord = (edge.end_mm - edge.start_mm) / np.linalg.norm(edge.end_mm - edge.start_mm)
            ups = [panels[one].axes[2] for one in (name, side.joins)]
            seen = [up - (up @ chord) * chord for up in ups]
            lengths = [np.linalg.norm(up) for up in seen]
            turn = np.degrees(np.arcsin(np.cross(*seen) @ chord / np.prod(lengths)))
            theirs = next(other for other in mitres[moulds[side.joins]].sides if other.joins == name)
            shares = [
                np.degrees(np.arcsin(np.sin(np.radians(one.mitre_deg)) / length))
                for one, length in zip((side, theirs), lengths, strict=True)
            ]
            assert sum(shares) == pytest.approx(-turn, abs=1e-4)
            largest = max(largest, abs(side.mitre_deg))
    assert largest > 0.01


def test_a_bed_and_a_plan_without_edges_are_refused(saddle):
    with pytest.raises(InputError, match=r"--edges: .*upright joints"):
        mitres_of(saddle, layup=Layup.BED)
    bare = tuple(replace(panel, edges=()) for panel in saddle.panels)
    with pytest.raises(InputError, match="nothing of the edges"):
        find_mitres(saddle.job, bare, saddle.sweeps, saddle.pieces)


def leaning_edges(panel, name, lean_deg=0.0, bow_mm=0.0):
    """The edges of the sample panel, one of them with a normal that leans outwards."""
    corners = np.array([[0, 0, 210.0], [1200, 0, 90.0], [1200, 1000, 210.0], [0, 1000, 90.0]])
    outwards = {"south": [0, -1, 0], "east": [1, 0, 0], "north": [0, 1, 0], "west": [-1, 0, 0]}
    edges = []
    for row, (edge, out) in enumerate(outwards.items()):
        lean = np.radians(lean_deg if edge == name else 0.0)
        edges.append(
            PanelEdge(
                name=edge,
                start_mm=corners[row],
                end_mm=corners[(row + 1) % 4],
                normal=np.sin(lean) * np.array(out) + np.cos(lean) * np.array([0.0, 0.0, 1.0]),
                bow_mm=bow_mm if edge == name else 0.0,
            )
        )
    return replace(panel, edges=tuple(edges))


def sample_mitres(panel, duty=Duty.COUNTER_MOULD, outline=None):
    sweep = sample_sweep(panels=("S1-A01",))
    pieces = sample_pieces(sweep, duty)
    return find_mitres(sample_job(layup=Layup.BENCH, units="m"), (panel,), (sweep,), pieces)


def test_a_side_that_leans_too_far_is_refused_by_panel_and_edge():
    assert len(sample_mitres(leaning_edges(sample_panel(), "north", 44.0))) == 2
    with pytest.raises(GeometryError, match=r"S1-A01: its north edge leans 46\.\d degrees .* at most 45"):
        sample_mitres(leaning_edges(sample_panel(), "north", 46.5))


def test_an_edge_no_straight_cut_follows_is_refused_with_the_length_that_would_do():
    assert len(sample_mitres(leaning_edges(sample_panel(), "east", 0.0, 1.9))) == 2
    remedy = r"S1-A01: .*its east edge would cut 0\.008 m .* no longer than about 0\.504 m"
    with pytest.raises(GeometryError, match=remedy):
        sample_mitres(leaning_edges(sample_panel(), "east", 0.0, 8.0))


def test_a_side_whose_plane_cuts_into_the_mould_face_is_refused():
    """The face itself is measured too: here the edge is said to run 5 mm inside of it."""
    panel = leaning_edges(sample_panel(), "")
    south = panel.edges[0]
    inside = np.array([0.0, 5.0, 0.0])
    moved = replace(south, start_mm=south.start_mm + inside, end_mm=south.end_mm + inside)

    with pytest.raises(GeometryError, match=r"S1-A01: .*south edge would cut 0\.005 m"):
        sample_mitres(replace(panel, edges=(moved, *panel.edges[1:])))


@pytest.mark.parametrize("duty", list(Duty))
def test_only_halves_that_lie_along_a_face_have_sides(duty):
    mitres = sample_mitres(leaning_edges(sample_panel(), "east", 10.0), duty)

    has_sides = duty in {Duty.MOULD, Duty.COUNTER_MOULD, Duty.CRADLE}
    assert set(mitres) == {"SM-S1-A01-L"} | ({"SM-S1-A01-U"} if has_sides else set())


def test_a_strip_has_the_sides_that_lie_over_it_only():
    panel = leaning_edges(sample_panel(), "")
    sweep = sample_sweep(panels=("S1-A01",))
    serving = replace(sweep.serving[0], shift_mm=np.array([0.0, 400.0, 0.0]), n_strips=2)
    strip = replace(sweep, width_mm=600.0, serving=(serving,))

    mitres = find_mitres(sample_job(layup=Layup.BENCH), (panel,), (strip,), sample_pieces(strip, Duty.SURPLUS))

    assert [side.edge for side in mitres["SM-S1-A01-L"].sides] == ["east", "north", "west"]
    assert all(side.is_whole for side in mitres["SM-S1-A01-L"].sides)


def test_a_panel_that_is_not_convex_is_cut_to_its_shape():
    """An L of 1200 x 1000 less 600 x 500 with upright sides: its litres are those under the outline."""
    ring = np.array([[0, 0], [1200, 0], [1200, 500], [600, 500], [600, 1000], [0, 1000]], dtype=float)
    heights = 150.0 + 60.0 * (2.0 * ring[:, 0] / 1200.0 - 1.0) * (2.0 * ring[:, 1] / 1000.0 - 1.0)
    corners = np.column_stack([ring, heights])
    edges = tuple(
        PanelEdge(
            name=f"free {row + 1}",
            start_mm=corners[row],
            end_mm=corners[(row + 1) % 6],
            normal=np.array([0.0, 0.0, 1.0]),
            bow_mm=0.0,
        )
        for row in range(6)
    )
    panel = sample_panel(outline=(ring,), is_rectangle=False, edges=edges)
    sweep = sample_sweep(panels=("S1-A01",), kerf_mm=(0.0, 0.0))
    pieces = sample_pieces(sweep)

    mitres = find_mitres(sample_job(layup=Layup.BENCH), (panel,), (sweep,), pieces)
    lower, upper = mitred(half_bodies(Layup.BENCH, (panel,), (sweep,), pieces), mitres)

    parts = [
        split_billet(sweep.near, sweep.far, (1200.0, 1000.0, 300.0), part)
        for part in (ring[[0, 1, 2]], ring[[0, 2, 3]], ring[[0, 3, 4]], ring[[0, 4, 5]])
    ]
    for half, body in enumerate((lower, upper)):
        assert mesh_volume(body.mesh) == pytest.approx(sum(mesh_volume(part[half]) for part in parts), rel=1e-6)
        solid = manifold3d.Manifold(manifold3d.Mesh64(body.mesh.vertices, body.mesh.triangles.astype(np.uint64)))
        assert solid.status() == manifold3d.Error.NoError


def test_copies_share_their_planes_and_name_their_own_neighbours(saddle):
    copies = [
        replace(panel, id=panel.id.replace("S-", f"S{copy}-"), copy=copy, neighbours=beside)
        for copy in (1, 2)
        for panel in saddle.panels
        for beside in [tuple((edge, other.replace("S-", f"S{copy}-")) for edge, other in panel.neighbours)]
    ]

    planes = side_planes(copies)

    np.testing.assert_array_equal(planes["S1-A01"].normals, planes["S2-A01"].normals)
    assert set(planes["S2-A01"].joins) == {"", "S2-A02", "S2-B01"}


def test_edges_seen_from_opposite_sides_stand_alone():
    panel = leaning_edges(sample_panel(), "")
    east = panel.edges[1]
    back = replace(east, start_mm=east.end_mm, end_mm=east.start_mm, normal=-east.normal, name="west")
    other = replace(sample_panel("T-A01"), face="T", edges=(back,))

    planes = side_planes((panel, other))

    assert planes["S1-A01"].joins == ("", "", "", "")
    assert planes["T-A01"].joins == ("",)


def test_a_half_without_a_panel_stays_as_it_is(saddle):
    lower = next(piece for piece in saddle.pieces if piece.half is Half.LOWER)
    pieces = tuple(replace(piece, duty=Duty.SURPLUS, panel=None) for piece in saddle.pieces)
    bodies = list(half_bodies(saddle.job.layup, saddle.panels, saddle.sweeps, pieces))

    mitres = find_mitres(saddle.job, saddle.panels, saddle.sweeps, pieces)

    assert mitres == {}
    assert next(iter(mitred(bodies, mitres))).name == lower.id
    assert mesh_volume(next(iter(mitred(bodies, mitres))).mesh) == mesh_volume(bodies[0].mesh)
