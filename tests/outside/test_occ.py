"""A boundary-representation kernel as judge: Open CASCADE Technology 7.9 (package cadquery-ocp-novtk below 8).

Rails are B-splines on one shared parameter, given to the kernel as poles and knots: interpolation with each curve's own
chord-length parameters would pair other points and give another surface.
"""

import numpy as np
import pytest
from scipy.interpolate import make_interp_spline

from cutblock.geometry import volume_below

pytest.importorskip("OCP", reason="Open CASCADE is not installed: pip install 'cadquery-ocp-novtk<8'")

from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeEdge, BRepBuilderAPI_Sewing
from OCP.BRepBuilderAPI import BRepBuilderAPI_MakeSolid as MakeSolid
from OCP.BRepFill import BRepFill
from OCP.BRepGProp import BRepGProp
from OCP.Geom import Geom_BSplineCurve
from OCP.gp import gp_Pnt
from OCP.GProp import GProp_GProps
from OCP.IFSelect import IFSelect_RetDone
from OCP.STEPControl import STEPControl_AsIs, STEPControl_Reader, STEPControl_Writer
from OCP.TColgp import TColgp_Array1OfPnt
from OCP.TColStd import TColStd_Array1OfInteger, TColStd_Array1OfReal
from OCP.TopAbs import TopAbs_SHELL
from OCP.TopExp import TopExp_Explorer
from OCP.TopoDS import TopoDS

LENGTH, WIDTH = 1200.0, 1000.0

pytestmark = pytest.mark.occ


def spline_rails():
    """Cubic rails x and z over [0, 1], from x = 0 to the length; skewed and wavy."""
    s = np.linspace(0.0, 1.0, 25)
    bump = np.sin(np.pi * s)
    near = np.column_stack([LENGTH * s - 40.0 * bump, 250.0 + 60.0 * np.sin(5.0 * s)])
    far = np.column_stack([LENGTH * s + 50.0 * bump, 240.0 + 70.0 * np.cos(4.0 * s)])
    return tuple(make_interp_spline(s, rail, k=3) for rail in (near, far))


def spline_volume(near, far):
    """Volume below the sheet of spline rails: Gauss points in every knot span (exact for the degree, and then some)."""
    knots = np.unique(near.t)
    nodes, weights = np.polynomial.legendre.leggauss(5)
    s = (knots[:-1, None] + np.diff(knots)[:, None] * (nodes + 1.0) / 2.0).ravel()
    weight = (np.diff(knots)[:, None] * weights / 2.0).ravel()
    (_, za), (_, zb) = near(s).T, far(s).T
    dxa, dxb = near.derivative()(s)[:, 0], far.derivative()(s)[:, 0]
    return WIDTH * float(weight @ ((za * dxa + zb * dxb) / 3.0 + (za * dxb + zb * dxa) / 6.0))


def curve(points, knots, degree):
    """A kernel curve of given poles (n, 3) and flat knots."""
    distinct, counts = np.unique(knots, return_counts=True)
    poles = TColgp_Array1OfPnt(1, len(points))
    for row, point in enumerate(points, start=1):
        poles.SetValue(row, gp_Pnt(*map(float, point)))
    values, repeats = TColStd_Array1OfReal(1, len(distinct)), TColStd_Array1OfInteger(1, len(distinct))
    for row, (value, count) in enumerate(zip(distinct, counts, strict=True), start=1):
        values.SetValue(row, float(value))
        repeats.SetValue(row, int(count))
    return BRepBuilderAPI_MakeEdge(Geom_BSplineCurve(poles, values, repeats, degree)).Edge()


def solid_below(near, far):
    """The closed solid between z = 0 and the ruled face of two rails, of ruled faces only."""

    def rail(spline, y, height):
        poles = np.column_stack([spline.c[:, 0], np.full(len(spline.c), y), spline.c[:, 1] * height])
        return curve(poles, spline.t, spline.k)

    edges = {(y, top): rail(spline, y, top) for y, spline in ((0.0, near), (WIDTH, far)) for top in (0.0, 1.0)}
    faces = [
        BRepFill.Face_s(edges[a], edges[b])
        for a, b in (
            ((0.0, 1.0), (WIDTH, 1.0)),
            ((0.0, 0.0), (WIDTH, 0.0)),
            ((0.0, 0.0), (0.0, 1.0)),
            ((WIDTH, 0.0), (WIDTH, 1.0)),
        )
    ]
    for s in (0.0, 1.0):
        (x, za), (_, zb) = near(s), far(s)
        line = np.array([0.0, 0.0, 1.0, 1.0])
        upper = curve(np.array([[x, 0.0, za], [x, WIDTH, zb]]), line, 1)
        lower = curve(np.array([[x, 0.0, 0.0], [x, WIDTH, 0.0]]), line, 1)
        faces.append(BRepFill.Face_s(lower, upper))
    sewing = BRepBuilderAPI_Sewing(1e-4)
    for face in faces:
        sewing.Add(face)
    sewing.Perform()
    shells = TopExp_Explorer(sewing.SewedShape(), TopAbs_SHELL)
    return MakeSolid(TopoDS.Shell_s(shells.Current())).Solid()


def solid_volume(shape):
    properties = GProp_GProps()
    BRepGProp.VolumePropertiesGK_s(shape, properties, 1e-10)
    return abs(properties.Mass())


def test_a_ruled_solid_between_spline_rails_has_the_volume_of_the_closed_form():
    near, far = spline_rails()
    exact = spline_volume(near, far)

    found = solid_volume(solid_below(near, far))

    assert found == pytest.approx(exact, rel=1e-7)
    s = np.linspace(0.0, 1.0, 4001)
    assert volume_below(near(s), far(s), WIDTH) == pytest.approx(found, rel=1e-7)


def test_a_ruled_solid_comes_back_from_a_step_file_with_its_volume(tmp_path):
    near, far = spline_rails()
    writer = STEPControl_Writer()
    writer.Transfer(solid_below(near, far), STEPControl_AsIs)
    assert writer.Write(str(tmp_path / "half.step")) == IFSelect_RetDone

    reader = STEPControl_Reader()
    assert reader.ReadFile(str(tmp_path / "half.step")) == IFSelect_RetDone
    reader.TransferRoots()

    assert solid_volume(reader.OneShape()) == pytest.approx(spline_volume(near, far), rel=1e-7)
