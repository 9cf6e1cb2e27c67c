import math
import re

import magpylib
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from service.physics.coil_field import (
    field_per_ampere_turn,
    flux_density_per_ampere,
    magnetic_field,
)
from service.physics.inductance import WindingSection, mutual_inductance_of_circles

MU_0 = 4e-7 * math.pi
ROUND = WindingSection(0.0, 0.0, 0.010, 0.016, 0.020)
RACETRACK = WindingSection(0.052, 0.0, 0.003, 0.007, 0.011)
BOX = WindingSection(0.020, 0.005, 0.003, 0.007, 0.011)
SHARP = WindingSection(0.020, 0.010, 0.0, 0.004, 0.008)


def test_on_the_axis_of_a_thick_round_coil_the_field_has_its_closed_form() -> None:
    def primitive(x: float) -> float:
        return x * math.log(
            (ROUND.outer_radius + math.hypot(ROUND.outer_radius, x))
            / (ROUND.inner_radius + math.hypot(ROUND.inner_radius, x))
        )

    for z in (0.0, 0.004, 0.010, 0.035, 0.2):
        half = 0.5 * ROUND.height
        expected = (primitive(z + half) - primitive(z - half)) / (2.0 * ROUND.area)
        field = magnetic_field(ROUND, 1.0, [0.0, 0.0, z])
        assert field[2] == pytest.approx(expected, rel=1e-10)
        assert abs(field[0]) + abs(field[1]) < 1e-8 * expected


@pytest.mark.parametrize("section", [ROUND, RACETRACK, BOX, SHARP])
def test_the_field_is_that_of_many_current_loops(section: WindingSection) -> None:
    # magpylib sums straight segments: polygons of 64 sides a corner, 12 x 12 turns by Gauss.
    points = np.array(
        [[0.001, 0.0005, 0.002], [0.004, -0.001, 0.009], [0.03, 0.02, 0.012], [-0.05, 0.0, 0.001]]
    )
    node, weight = np.polynomial.legendre.leggauss(12)
    radii = section.mean_radius + 0.5 * section.build * node
    levels = 0.5 * section.height * node
    expected = np.zeros_like(points)
    for radius, share in zip(radii, weight, strict=True):
        # A polygon with the area of the arc: its corners stand a little further out.
        step = 0.5 * math.pi / 256
        angle = (np.arange(4)[:, None] * 0.5 * math.pi + (np.arange(256) + 0.5) * step).ravel()
        grown = radius * math.sqrt(step / math.sin(step))
        side_x = 0.5 * section.straight_x * np.sign(np.cos(angle))
        side_y = 0.5 * section.straight_y * np.sign(np.sin(angle))
        line = np.stack(
            [side_x + grown * np.cos(angle), side_y + grown * np.sin(angle), 0 * angle], axis=-1
        )
        closed = np.vstack([line, line[:1]])
        loop = magpylib.current.Polyline(current=1.0, vertices=closed)  # type: ignore[no-untyped-call] # untyped library
        for level, part in zip(levels, weight, strict=True):
            below = points - [0.0, 0.0, level]
            expected += 0.25 * share * part * loop.getH(below)  # type: ignore[no-untyped-call] # same
    field = magnetic_field(section, 1.0, points)
    scale = np.linalg.norm(expected, axis=-1, keepdims=True)
    assert np.max(np.abs(field - expected) / scale) < 2e-5


def test_flux_through_a_small_coaxial_circle_is_the_mutual_inductance() -> None:
    section = WindingSection(0.0, 0.0, 0.0099, 0.0101, 0.0002)
    radius, height = 0.004, 0.003
    node, weight = np.polynomial.legendre.leggauss(20)
    rho = 0.5 * radius * (node + 1.0)
    points = np.stack([rho, 0 * rho, np.full_like(rho, height)], axis=-1)
    flux = float(
        np.sum(
            math.pi * radius * weight * rho * flux_density_per_ampere(section, 1.0, points)[:, 2]
        )
    )
    assert flux == pytest.approx(mutual_inductance_of_circles(0.010, radius, height), rel=1e-4)


@pytest.mark.parametrize("section", [RACETRACK, BOX, SHARP])
def test_outside_the_winding_the_field_has_neither_source_nor_curl(section: WindingSection) -> None:
    step = 1e-5
    place = np.array([0.4 * section.straight_x, 0.1 * section.inner_radius, 0.55 * section.height])
    moved = place + step * np.array([*np.eye(3), *-np.eye(3)])
    field = magnetic_field(section, 1.0, moved)
    gradient = (field[:3] - field[3:]) / (2.0 * step)
    scale = np.abs(gradient).max()
    assert abs(np.trace(gradient)) < 1e-5 * scale
    assert np.max(np.abs(gradient - gradient.T)) < 1e-5 * scale


def test_the_work_around_the_winding_is_the_current_through_it() -> None:
    node, weight = np.polynomial.legendre.leggauss(60)
    work = 0.0
    corners = np.array([[0.0, 0.0, 0.02], [0.0, 0.03, 0.02], [0.0, 0.03, -0.02], [0.0, 0.0, -0.02]])
    for start, stop in zip(corners, np.roll(corners, -1, axis=0), strict=True):
        points = 0.5 * (start + stop) + 0.5 * np.outer(node, stop - start)
        work += 0.5 * float(weight @ (magnetic_field(RACETRACK, 7000.0, points) @ (stop - start)))
    assert abs(work) == pytest.approx(7000.0, rel=1e-9)


@pytest.mark.parametrize("depth", [1e-3, 1e-4, 1e-6, 0.0])
def test_beside_the_conductor_the_field_stays_right(depth: float) -> None:
    # Near the end of a straight side and at the apex: the rule against its own converged value.
    points = np.array([[0.0259, RACETRACK.inner_radius - depth, 0.002], [0.029 - depth, 0.0, 0.0]])
    coarse = magnetic_field(RACETRACK, 1.0, points)
    fine = field_per_ampere_turn(RACETRACK, points, 200)
    assert np.max(np.abs(coarse - fine)) < 1e-6 * np.max(np.abs(fine))


@settings(max_examples=25, deadline=None)
@given(st.floats(-0.03, 0.03), st.floats(-0.002, 0.002), st.floats(0.006, 0.03))
def test_mirroring_the_point_mirrors_the_field(x: float, y: float, z: float) -> None:
    points = np.array([[x, y, z], [-x, y, z], [x, -y, z], [x, y, -z]])
    field, over_x, over_y, over_z = magnetic_field(BOX, 1.0, points)
    scale = float(np.abs(field).max())
    assert np.allclose(over_x, field * [-1, 1, 1], atol=1e-9 * scale)
    assert np.allclose(over_y, field * [1, -1, 1], atol=1e-9 * scale)
    assert np.allclose(over_z, field * [-1, -1, 1], atol=1e-9 * scale)


def test_the_answer_keeps_the_shape_of_the_points() -> None:
    points = np.zeros((2, 5, 3))
    assert magnetic_field(BOX, 3.0, points).shape == (2, 5, 3)
    assert magnetic_field(BOX, 3.0, points[0, 0]).shape == (3,)


@pytest.mark.parametrize(
    ("turns", "points", "words"),
    [
        (-1.0, [0.0, 0.0, 0.0], "turns must not be negative, got -1.0"),
        (1.0, [0.0, 0.0], "points must have x, y, z in the last axis, got shape (2,)"),
        (1.0, 0.0, "points must have x, y, z in the last axis, got shape ()"),
        (1.0, [0.0, math.nan, 0.0], "points must be finite, got"),
        (1.0, [0.0, 0.005, 0.0], "points must lie outside the conductor, got [0.0, 0.005, 0.0]"),
    ],
)
def test_impossible_points_are_refused(turns: float, points: object, words: str) -> None:
    with pytest.raises(ValueError, match=re.escape(words)):
        magnetic_field(RACETRACK, turns, points)  # type: ignore[arg-type] # deliberately wrong
