"""Quantities: exact on linear fields in any axes, laws under turn and reflection, entries of the glossary."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fieldview.compute.axes import turn_axes
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import QUANTITIES, quantity, quantity_map
from fieldview.compute.stencils import SCHEMES
from fieldview.compute.units import PIXEL
from tests.compute.flows import lattice, linear_field, vortex

GRADIENT = ((0.3, -0.7), (1.1, 0.45))
(UX, UY), (VX, VY) = GRADIENT
TENSOR = np.array(GRADIENT)
STRAIN = 0.5 * (TENSOR + TENSOR.T)
ROTATION = 0.5 * (TENSOR - TENSOR.T)

# by definition of each, from the tensor alone
EXPECTED = {
    "vorticity": VX - UY,
    "divergence": np.trace(TENSOR),
    "shear_strain_rate": STRAIN[0, 1],
    "normal_strain_rate": 0.5 * (STRAIN[0, 0] - STRAIN[1, 1]),
    "max_strain_rate": np.linalg.eigvalsh(STRAIN).max(),
    "q_criterion": 0.5 * ((ROTATION**2).sum() - (STRAIN**2).sum()),
    "okubo_weiss": (UX - VY) ** 2 + (VX + UY) ** 2 - (VX - UY) ** 2,
    "swirling_strength": np.abs(np.linalg.eigvals(TENSOR).imag).max(),
}
UNCHANGED_BY_A_TURN = ("divergence", "max_strain_rate", "q_criterion", "okubo_weiss", "swirling_strength")


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("scheme", SCHEMES)
def test_linear_fields_are_exact_whatever_the_axes(scheme, even):
    grid = lattice(12, 15, even=even)
    placed = Grid(grid.x, grid.y, grid.placement.then(turn=0.83, about=1 + 2j, reflect="y", shift=4 - 1j))
    missing = np.random.default_rng(1).random(grid.shape) < 0.1
    for own in (grid, placed):
        field = linear_field(own, GRADIENT, missing=missing)
        for name, expected in EXPECTED.items():
            values = quantity(field, name, scheme=scheme)
            assert np.isfinite(values).sum() > 0.8 * missing.size
            np.testing.assert_allclose(values[np.isfinite(values)], expected, atol=2e-12, err_msg=name)


@settings(max_examples=25, deadline=None)
@given(
    angle=st.floats(-7, 7),
    reflect=st.sampled_from([None, "x", "y"]),
    about=st.complex_numbers(max_magnitude=10),
    scheme=st.sampled_from(list(SCHEMES)),
)
def test_laws_of_turn_and_reflection(angle, reflect, about, scheme):
    rng = np.random.default_rng(4)
    grid = lattice(9, 10)
    u, v = np.where(rng.random(grid.shape) < 0.1, np.nan, rng.normal(size=(2, *grid.shape)))
    field = Field(grid, u=u, v=np.where(np.isnan(u), np.nan, v), derivative=scheme)
    turned = turn_axes(field, angle=angle, about=about, reflect=reflect)
    sign = -1 if reflect else 1
    close = {"rtol": 0, "atol": 1e-10, "equal_nan": True}
    np.testing.assert_allclose(quantity(turned, "vorticity"), sign * quantity(field, "vorticity"), **close)
    for name in (*UNCHANGED_BY_A_TURN, "speed", "kinetic_energy"):
        # a square root near zero halves the digits
        atol = 1e-6 if name == "swirling_strength" else 1e-10
        np.testing.assert_allclose(
            quantity(turned, name), quantity(field, name), rtol=0, atol=atol, err_msg=name
        )
    # the two strain components turn into each other at twice the angle
    strain = quantity(field, "normal_strain_rate") + 1j * quantity(field, "shear_strain_rate")
    after = quantity(turned, "normal_strain_rate") + 1j * quantity(turned, "shear_strain_rate")
    expected = strain * np.exp(-2j * angle)
    np.testing.assert_allclose(after, expected.conj() if reflect else expected, **close)


def test_quarter_turn_leaves_no_round_off():
    field = vortex(lattice(8, 8), core=0.8, centre=-2 + 3j)
    turned = turn_axes(field, angle=math.pi / 2)
    np.testing.assert_allclose(
        quantity(turned, "vorticity"), quantity(field, "vorticity"), rtol=0, atol=1e-14, equal_nan=True
    )


def test_radial_and_tangential_components_about_a_centre():
    grid = lattice(7, 9)
    centre = 0.5 + 3.1j
    arm = grid.nodes - centre
    velocity = (2.0 + 3.0j) * arm / np.abs(arm)
    field = Field(grid, u=velocity.real, v=velocity.imag)
    np.testing.assert_allclose(quantity(field, "radial_velocity", centre=centre), 2.0)
    np.testing.assert_allclose(quantity(field, "tangential_velocity", centre=(0.5, 3.1)), 3.0)


def test_there_is_no_radial_direction_at_the_centre_itself():
    grid = Grid(np.arange(3.0), np.arange(3.0))
    values = quantity(linear_field(grid, GRADIENT), "radial_velocity")
    assert np.isnan(values[1, 1]) and np.isfinite(values).sum() == 8


def test_speed_and_energy_take_all_measured_components():
    grid = lattice(3, 3)
    u, v, w = (np.full(grid.shape, value) for value in (2.0, 3.0, 6.0))
    field = Field(grid, u=u, v=v, w=w)
    np.testing.assert_allclose(quantity(field, "speed"), 7.0)
    np.testing.assert_allclose(quantity(field, "kinetic_energy"), 24.5)
    np.testing.assert_allclose(quantity(field, "direction"), math.atan2(3, 2))


def test_counts_fallback_nodes():
    grid = lattice(10, 12)
    found = quantity_map(linear_field(grid, GRADIENT), "vorticity")
    assert found.fallback_count == 10 * 12 - 8 * 10
    assert quantity_map(linear_field(grid, GRADIENT), "speed").fallback_count == 0


def test_every_entry_is_complete_and_has_a_unit():
    field = linear_field(lattice(5, 5), GRADIENT)
    assert list(QUANTITIES) == [entry.name for entry in QUANTITIES.values()]
    units = {name: quantity_map(field, name).unit for name in QUANTITIES if name != "w"}
    assert units["vorticity"] == "1/s" and units["okubo_weiss"] == "1/s^2"
    assert units["kinetic_energy"] == "m^2/s^2" and units["direction"] == "rad" and units["u"] == "m/s"
    pixels = quantity_map(field.with_(units=PIXEL), "divergence")
    assert pixels.unit == "1/pulse"
    for entry in QUANTITIES.values():
        assert entry.title and entry.symbol and entry.group and entry.needs


def test_errors_say_what_is_missing():
    grid = lattice(4, 4)
    alone = Field(grid, w=np.ones(grid.shape))
    with pytest.raises(InputError, match="vorticity needs the component u, which this field does not have"):
        quantity(alone, "vorticity")
    with pytest.raises(InputError, match='quantity "spin" is not known; the quantities are: u, v, w'):
        quantity(alone, "spin")
    row = Grid(np.arange(5.0), [0.0])
    with pytest.raises(InputError, match="at least two rows and two columns"):
        quantity(linear_field(row, GRADIENT), "divergence")


def test_the_field_is_left_as_it_was():
    field = vortex(lattice(8, 8), core=0.8, centre=-2 + 3j)
    before = field.u.copy(), field.v.copy()
    for name in QUANTITIES:
        if name != "w":
            quantity_map(field, name)
    np.testing.assert_array_equal(field.u, before[0])
    np.testing.assert_array_equal(field.v, before[1])
