"""Reading nodal values at points."""

import numpy as np
import pytest

from fem.errors import MeshError
from fem.mesh.locate import barycentric, interpolation
from fem.mesh.make import make_mesh
from fem.section.build import build_plan
from tests.support.grids import square
from tests.support.shapes import disc

MESH = square(5, size=2.0)


def test_a_plane_is_read_exactly():
    rng = np.random.default_rng(7)
    points = 2.0 * rng.random((200, 2))
    x, y = MESH.points.T
    read = interpolation(MESH, points) @ (3.0 + 2.0 * x - y)
    assert read == pytest.approx(3.0 + 2.0 * points[:, 0] - points[:, 1])


def test_nodes_corners_and_edges_are_read_as_they_are():
    values = np.cos(np.arange(len(MESH.points)))
    assert interpolation(MESH, MESH.points) @ values == pytest.approx(values, abs=1e-9)


def test_rows_are_weights():
    P = interpolation(MESH, np.array([[0.31, 0.77], [2.0, 1.999]]))
    assert P.shape == (2, len(MESH.points))
    assert P.sum(axis=1) == pytest.approx([1.0, 1.0])
    assert P.data.min() >= 0.0


def test_a_point_a_rounding_error_outside_is_taken_in():
    assert (interpolation(MESH, np.array([[2.0 + 1e-9, 1.0]])) @ MESH.points[:, 0])[0] == pytest.approx(2.0)


def test_a_point_outside_is_refused_with_its_place():
    with pytest.raises(MeshError, match=r"2\.1"):
        interpolation(MESH, np.array([[1.0, 1.0], [2.1, 1.0]]))


def test_a_point_on_an_arc_lies_beyond_the_chords_and_is_still_read():
    mesh = make_mesh(build_plan([disc("rod", 0.0, 0.0, 1.0)]))
    angle = np.linspace(0, 2 * np.pi, 97)
    on = np.column_stack((np.cos(angle), np.sin(angle)))
    read = interpolation(mesh, on) @ np.hypot(*mesh.points.T)
    assert read == pytest.approx(np.ones(97), abs=0.1)
    with pytest.raises(MeshError):
        interpolation(mesh, np.array([[1.2, 0.0]]))


def test_no_points_are_no_rows():
    assert interpolation(MESH, np.zeros((0, 2))).shape == (0, len(MESH.points))


def test_barycentric_coordinates_of_the_corners_and_the_middle():
    corners = np.array([[[0.0, 0.0], [2.0, 0.0], [0.0, 1.0]]])
    assert barycentric(corners, np.array([2.0, 0.0]))[0] == pytest.approx([0, 1, 0])
    assert barycentric(corners, np.array([2 / 3, 1 / 3]))[0] == pytest.approx([1 / 3] * 3)
    assert barycentric(corners, np.array([2.0, 1.0]))[0].min() < 0
