"""Changes of axes and of the observer."""

import cmath
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldview.compute.axes import calibrate, moving_frame, remove_mean, turn_axes
from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.errors import InputError
from fieldview.compute.field import Event, Field, Status
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import quantity
from fieldview.compute.units import METRIC, PIXEL
from tests.compute.flows import lattice, linear_field, stated, vortex


def pixels(**attributes) -> Field:
    grid = Grid(np.arange(6) * 16.0 + 8, np.arange(5) * 16.0 + 8)
    return linear_field(grid, ((0.01, -0.02), (0.03, 0.005)), units=PIXEL, **attributes)


def test_calibration_scales_places_velocities_and_errors():
    error = ErrorModel(
        sigma={"u": 0.1, "v": np.full((5, 6), 0.2)},
        origin="from file",
        window=(32.0, 32.0),
        systematic=Systematic(zero_offset=0.5),
    )
    before = pixels(error=error)
    after = calibrate(before, metres_per_pixel=(1e-4, 2e-4), pulse_separation=0.008, origin=(8, 40))
    assert after.units == METRIC
    np.testing.assert_allclose(after.grid.x, (before.grid.x - 8) * 1e-4)
    np.testing.assert_allclose(after.grid.y, (before.grid.y - 40) * 2e-4)
    np.testing.assert_allclose(after.u, before.u * 1e-4 / 0.008)
    np.testing.assert_allclose(after.measured["v"], before.v * 2e-4 / 0.008)
    assert after.error.sigma["u"] == pytest.approx(0.1 * 1e-4 / 0.008)
    np.testing.assert_allclose(after.error.sigma["v"], 0.2 * 2e-4 / 0.008)
    assert after.error.window == pytest.approx((3.2e-3, 6.4e-3))
    assert after.error.systematic.zero_offset == pytest.approx(0.5 * math.sqrt(2) * 1e-4 / 0.008)


def test_calibrated_vorticity_is_per_pulse_over_pulse_separation():
    before = pixels()
    after = calibrate(before, metres_per_pixel=1e-4, pulse_separation=0.008)
    np.testing.assert_allclose(quantity(after, "vorticity"), quantity(before, "vorticity") / 0.008, rtol=1e-9)


def test_calibration_is_refused_where_it_makes_no_sense():
    with pytest.raises(InputError, match="in metres and seconds already"):
        calibrate(pixels().with_(units=METRIC), metres_per_pixel=1e-4, pulse_separation=1e-3)
    with pytest.raises(InputError, match="give positive numbers"):
        calibrate(pixels(), metres_per_pixel=-1e-4, pulse_separation=1e-3)
    with pytest.raises(InputError, match="must come before the axes are turned"):
        calibrate(turn_axes(pixels(), angle=1.0), metres_per_pixel=1e-4, pulse_separation=1e-3)


@given(
    angle=st.floats(-10, 10),
    about=st.complex_numbers(max_magnitude=5),
    reflect=st.sampled_from([None, "x", "y"]),
    shift=st.complex_numbers(max_magnitude=5),
)
def test_turning_axes_moves_points_and_vectors_alike(angle, about, reflect, shift):
    """The vector from one node to the next, given as a velocity, stays that vector."""
    grid = lattice(4, 5)
    step = grid.nodes[2, 3] - grid.nodes[1, 1]
    field = Field(grid, u=np.full(grid.shape, step.real), v=np.full(grid.shape, step.imag))
    turned = turn_axes(field, angle=angle, about=about, reflect=reflect, shift=shift)
    nodes = turned.grid.nodes
    np.testing.assert_allclose(turned.u + 1j * turned.v, nodes[2, 3] - nodes[1, 1], atol=1e-12)
    np.testing.assert_allclose(turned.measured["u"], turned.u)
    back = {"u": field.u, "v": field.v}
    for name, part in turned.lattice_components().items():
        np.testing.assert_allclose(part, back[name], atol=1e-12)


def test_axes_turned_counter_clockwise_read_a_vector_turned_back():
    grid = lattice(3, 3)
    field = Field(grid, u=np.ones(grid.shape), v=np.zeros(grid.shape))
    turned = turn_axes(field, angle=math.radians(30))
    np.testing.assert_allclose(turned.u + 1j * turned.v, cmath.exp(-1j * math.radians(30)))
    mirrored = turn_axes(field, reflect="x")
    np.testing.assert_allclose(mirrored.u, -1.0)
    np.testing.assert_allclose(mirrored.grid.nodes.real, -grid.nodes.real)


def test_a_shift_alone_leaves_the_components_as_they_are():
    field = linear_field(lattice(3, 4), ((1, 2), (3, 4)))
    moved = turn_axes(field, shift=2 - 1j)
    assert moved.u is field.u and np.allclose(moved.grid.nodes, field.grid.nodes + 2 - 1j)


def test_one_component_cannot_be_turned_but_w_can():
    grid = lattice(3, 3)
    with pytest.raises(InputError, match="only be turned or reflected where both u and v are there"):
        turn_axes(Field(grid, u=np.ones(grid.shape)), angle=1.0)
    across = turn_axes(Field(grid, w=np.ones(grid.shape)), angle=1.0)
    np.testing.assert_array_equal(across.w, 1.0)
    with pytest.raises(InputError, match='reflect is "z"; write "x", "y" or null'):
        turn_axes(across, reflect="z")


@pytest.mark.parametrize("reflect", [None, "x", "y"])
def test_the_turn_leads_back_to_the_axes_of_the_errors(reflect):
    field = vortex(lattice(5, 5), core=1.0, centre=-2 + 3j, error=stated({"u": 0.1, "v": 0.2}))
    turned = turn_axes(turn_axes(field, angle=0.4), angle=0.9, reflect=reflect)
    back = turned.error.turn * (turned.u + 1j * turned.v)
    np.testing.assert_allclose(np.abs(back.real), np.abs(field.u), atol=1e-13)
    np.testing.assert_allclose(np.abs(back.imag), np.abs(field.v), atol=1e-13)


def test_an_observer_who_turns_with_a_solid_body_sees_rest():
    grid = lattice(6, 7)
    centre, rate, drift = 1.0 + 2.0j, 3.0, 0.5 - 0.25j
    velocity = drift + 1j * rate * (grid.nodes - centre)
    field = turn_axes(Field(grid, u=velocity.real, v=velocity.imag), angle=0.0, shift=1j)
    seen = moving_frame(field, velocity=drift, rotation=rate, about=centre + 1j)
    np.testing.assert_allclose(seen.u, 0, atol=1e-12)
    np.testing.assert_allclose(seen.v, 0, atol=1e-12)
    np.testing.assert_allclose(seen.measured["v"], 0, atol=1e-12)


def test_the_mean_is_that_of_valid_vectors_and_is_taken_from_rejected_ones_too():
    rng = np.random.default_rng(0)
    grid = lattice(5, 6)
    field = Field(grid, u=rng.normal(size=grid.shape), v=rng.normal(size=grid.shape))
    nodes = np.zeros(grid.shape, bool)
    nodes[2, 3] = True
    field = field.reject(nodes, Event(0, "hand_edit", "rejected", nodes))
    mean = np.nanmean(field.u)
    still = remove_mean(field)
    assert abs(np.nanmean(still.u)) < 1e-15 and abs(np.nanmean(still.v)) < 1e-15
    assert still.measured["u"][2, 3] == pytest.approx(field.measured["u"][2, 3] - mean)
    assert still.status[2, 3] == Status.REJECTED and np.isnan(still.u[2, 3])
    applied = still.maps[-1].forward(np.nan_to_num(field.u).ravel()).reshape(grid.shape)
    np.testing.assert_allclose(applied[field.valid], still.u[field.valid])


def test_a_mean_of_nothing_is_refused():
    grid = lattice(2, 2)
    with pytest.raises(InputError, match="no valid vector to take a mean of"):
        remove_mean(Field(grid, u=np.full(grid.shape, np.nan)))
