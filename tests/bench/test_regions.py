"""Regions on 1000 x 1000 nodes, as multiples of a pair of numpy gradients, interleaved in one process.

pair = np.gradient(u, axis=0) + np.gradient(v, axis=1) on the same arrays.
"""

from time import perf_counter

import numpy as np
import pytest
import shapely
from matplotlib.path import Path
from scipy.interpolate import RegularGridInterpolator

from fieldview.compute import shapes
from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.quantities import quantity
from fieldview.compute.region import measure_region, prepare, quick_numbers

NODES, ROUNDS = 1000, 15


def field_of(nodes: int) -> Field:
    """A smooth flow with noise, two nodes of correlated errors, everything stated."""
    rng = np.random.default_rng(0)
    axis = np.arange(nodes) * 0.1
    wave = 2 * np.pi / (40 * nodes / NODES)
    smooth = np.sin(wave * axis)[None, :] * np.cos(wave * axis)[:, None]
    u, v = smooth + 0.02 * rng.normal(size=(2, nodes, nodes))
    error = ErrorModel(
        sigma={"u": 0.02, "v": 0.02},
        origin="given",
        correlation=(2.0, 2.0),
        correlation_stated=True,
        systematic=Systematic(0.003, 0.001, 0.0, 0.002, 0.0),
        window=(0.2, 0.2),
    )
    return Field(Grid(axis, axis), u=u, v=v, error=error)


def polygon(nodes: int) -> shapes.Polygon:
    """64 corners at about 0.3 of the grid's side from its middle."""
    rng = np.random.default_rng(1)
    angles = 2 * np.pi * np.arange(64) / 64
    z = 0.05 * nodes * (1 + 1j) + 0.03 * nodes * rng.uniform(0.97, 1.03, 64) * np.exp(1j * angles)
    return shapes.Polygon(tuple((float(p.real), float(p.imag)) for p in z))


@pytest.fixture(scope="module")
def field():
    return field_of(NODES)


def interleaved(work, other) -> float:
    """Median time of the work over the median time of the other, taken in turn."""
    times = ([], [])
    for _ in range(ROUNDS):
        for kept, call in zip(times, (work, other), strict=True):
            start = perf_counter()
            call()
            kept.append(perf_counter() - start)
    work_time, other_time = (float(np.median(kept)) for kept in times)
    print(f"\n{work_time / other_time:.3f} = {1e3 * work_time:.2f} ms / {1e3 * other_time:.2f} ms")
    return work_time / other_time


def pair_of(field):
    return lambda: np.gradient(field.u, axis=0) + np.gradient(field.v, axis=1)


def test_quick_numbers_within_half_a_pair(field):
    ready, shape = prepare(field), polygon(NODES)
    numbers = quick_numbers(field, shape, ready)
    assert numbers.circulation.random > 0 and numbers.flux.random > 0
    assert numbers.vorticity_integral.value is not None and numbers.coverage["area"] == 1.0
    assert interleaved(lambda: quick_numbers(field, shape, ready), pair_of(field)) <= 0.5


def test_quick_numbers_grow_with_the_contour_and_not_with_the_grid(field):
    ready, shape = prepare(field), polygon(NODES)
    small = field_of(100)
    small_ready, small_shape = prepare(small), polygon(100)
    ratio = interleaved(
        lambda: quick_numbers(field, shape, ready), lambda: quick_numbers(small, small_shape, small_ready)
    )
    assert ratio <= 8


def test_every_number_within_five_pairs(field):
    ready, shape = prepare(field), polygon(NODES)
    numbers = measure_region(field, shape, prepared=ready)
    assert numbers.circulation.combined > 0 and numbers.vorticity_integral.combined > 0
    assert numbers.inside["speed"]["mean"].combined > 0
    assert interleaved(lambda: measure_region(field, shape, prepared=ready), pair_of(field)) <= 5


def test_quick_numbers_fifty_times_faster_than_sampling_and_a_mask(field):
    """Against a line sampled to 1e-6 of its circulation, and vorticity summed over the nodes inside."""
    ready, shape = prepare(field), polygon(NODES)
    omega = quantity(field, "vorticity")
    exact = quick_numbers(field, shape, ready).circulation.value

    def sampled(per_edge: int) -> float:
        start, step = shape.vertices, np.roll(shape.vertices, -1) - shape.vertices
        t = (np.arange(per_edge) + 0.5) / per_edge
        z = (start[:, None] + step[:, None] * t).ravel()
        at = RegularGridInterpolator((field.grid.y, field.grid.x), np.stack([field.u, field.v], axis=-1))
        values = at(np.column_stack([z.imag, z.real]))
        dz = np.repeat(step / per_edge, per_edge)
        return float((values[:, 0] * dz.real + values[:, 1] * dz.imag).sum())

    x, y = np.meshgrid(field.grid.x, field.grid.y)
    places, corners = np.column_stack([x.ravel(), y.ravel()]), np.column_stack([*_xy(shape)])

    def masked() -> float:
        """The test for points in a polygon that is usual in scripts (common practice, no source)."""
        return float(omega.ravel()[Path(corners).contains_points(places)].sum()) * 0.01

    def masked_by_shapely() -> float:
        outline = shapely.Polygon(corners)
        shapely.prepare(outline)
        return float(omega[shapely.contains_xy(outline, x, y)].sum()) * 0.01

    per_edge = 100
    while abs(sampled(per_edge) - exact) > 1e-6 * abs(exact):
        per_edge *= 2
    assert masked() == pytest.approx(exact, rel=0.2)
    for name, sums, least in (("usual", masked, 50), ("prepared", masked_by_shapely, 1)):
        ratio = interleaved(
            lambda: quick_numbers(field, shape, ready), lambda s=sums: (sampled(per_edge), s())
        )
        print(f"{1 / ratio:.0f} x faster than sampling and the {name} mask")
        assert ratio <= 1 / least


def _xy(shape):
    return shape.vertices.real, shape.vertices.imag
