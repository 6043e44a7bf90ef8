"""Line and area integrals of regions, against plain quadrature and exact flows."""

from itertools import pairwise

import numpy as np
import pytest
import shapely

from fieldview.compute import shapes
from fieldview.compute.contour import Contour
from fieldview.compute.field import Field, Status
from fieldview.compute.grid import Grid, Placement
from fieldview.compute.region import measure_region, prepare, quick_numbers
from tests.compute.contours import PLACEMENTS, area_integral, line_integral, middle, reach, star
from tests.compute.flows import lattice, linear_field, uneven, vortex


def placed(grid: Grid, name: str) -> Grid:
    return Grid(grid.x, grid.y, PLACEMENTS[name])


def random_field(grid: Grid, seed: int = 0, **attributes) -> Field:
    u, v = np.random.default_rng(seed).normal(size=(2, *grid.shape))
    return Field(grid, u=u, v=v, **attributes)


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("place", PLACEMENTS)
def test_line_integrals_equal_brute_force(even, place):
    rng = np.random.default_rng(1)
    grid = placed(lattice(11, 13, even=even), place)
    field = random_field(grid)
    for _ in range(5):
        shape = star(rng, middle(grid), reach(grid))
        expected = line_integral(field.u + 1j * field.v, grid, shape.vertices)
        found = measure_region(field, shape)
        scale = np.abs(field.u + 1j * field.v).max() * shape.length
        assert abs(complex(found.circulation.value, found.flux.value) - expected) < 1e-12 * scale


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("place", PLACEMENTS)
def test_area_integrals_equal_triangles_cut_by_shapely(even, place):
    rng = np.random.default_rng(2)
    grid = placed(lattice(8, 9, even=even), place)
    field = random_field(grid)
    ready = prepare(field)
    for _ in range(2):
        shape = star(rng, middle(grid), reach(grid))
        expected = area_integral(ready.rates, grid, shape)
        found = quick_numbers(field, shape, ready)
        rates = complex(found.vorticity_integral.value, found.divergence_integral.value)
        assert abs(rates - expected) < 1e-12 * np.abs(ready.rates).max() * shape.area


@pytest.mark.parametrize("scheme", ["central", "richardson", "least_squares", "circulation"])
@pytest.mark.parametrize("place", PLACEMENTS)
def test_area_weights_give_the_running_sums_integral(scheme, place):
    """The transpose of the derivative times exact area weights, against sums of nodal vorticity."""
    rng = np.random.default_rng(3)
    grid = placed(lattice(14, 15, even=False), place)
    missing = np.zeros(grid.shape, bool)
    missing[2, 3] = missing[12, 11] = True
    field = random_field(grid, derivative=scheme)
    field = Field(
        grid,
        u=np.where(missing, np.nan, field.u),
        v=np.where(missing, np.nan, field.v),
        derivative=scheme,
    )
    ready = prepare(field)
    for _ in range(4):
        contour = Contour(star(rng, middle(grid), 0.8 * reach(grid)), ready)
        if contour.rate_share < 1:
            continue
        expected = ready.rate_sums.integral(contour.rate_pieces)
        found = ready.of_pair(contour.rates)
        assert abs(found - expected) < 1e-12 * np.abs(contour.rates.values).sum()
        break
    else:
        pytest.fail("no contour lies between the gaps")


@pytest.mark.parametrize("scheme", ["central", "richardson", "least_squares", "circulation"])
@pytest.mark.parametrize("place", PLACEMENTS)
def test_on_an_even_grid_the_nodes_beside_the_contour_give_the_same(scheme, place):
    rng = np.random.default_rng(4)
    grid = placed(Grid(np.arange(25.0) * 0.5, np.arange(27.0) * 0.5), place)
    ready = prepare(random_field(grid, derivative=scheme))
    node = middle(grid)  # so that corners and edges of the square lie on nodes
    square = node + np.array([-1 - 1j, 1 - 1j, 1 + 1j, -1 + 1j])
    corners = shapes.Polygon(tuple((float(z.real), float(z.imag)) for z in square))
    for shape in (star(rng, node, 0.7 * reach(grid)), corners):
        contour = Contour(shape, ready)
        assert contour.rate_share == 1
        expected = ready.rate_sums.integral(contour.rate_pieces)
        found = ready.of_pair(contour.rates)
        assert abs(found - expected) < 1e-12 * np.abs(contour.rates.values).sum()


@pytest.mark.parametrize("seed", range(4))
def test_extremes_are_those_of_the_nodes_within(seed):
    """Against shapely's nodes, in blocks that are cut by the contour and blocks that are not."""
    rng = np.random.default_rng(seed)
    grid = lattice(40, 170)
    missing = rng.random(grid.shape) < 0.1
    missing[5:-5, 5:-5] = False
    field = random_field(grid)
    field = Field(grid, u=np.where(missing, np.nan, field.u), v=np.where(missing, np.nan, field.v))
    x0, x1, y0, y1 = grid.x[6], grid.x[-7], grid.y[6], grid.y[-7]
    arm = np.exp(2j * np.pi * np.sort(rng.random(9)))
    z = middle(grid) + 0.5 * ((x1 - x0) * arm.real + 1j * (y1 - y0) * arm.imag)
    shape = shapes.Polygon(tuple((float(p.real), float(p.imag)) for p in z))
    inside = measure_region(field, shape).inside
    outline = shapely.Polygon(np.column_stack([z.real, z.imag]))
    held = shapely.contains_xy(outline, grid.nodes.real, grid.nodes.imag)
    speed = np.hypot(field.u, field.v)
    for name, values in (("u", field.u), ("v", field.v), ("speed", speed)):
        assert inside[name]["min"].value == pytest.approx(values[held].min(), rel=1e-14)
        assert inside[name]["max"].value == pytest.approx(values[held].max(), rel=1e-14)


def test_measured_share_of_the_area_is_exact_with_gaps():
    rng = np.random.default_rng(4)
    grid = lattice(9, 10, even=False)
    missing = np.zeros(grid.shape, bool)
    missing[3, 4] = missing[6, 6] = True
    field = Field(grid, u=np.where(missing, np.nan, 1.0), v=np.where(missing, np.nan, 1.0))
    ready = prepare(field)
    shape = star(rng, middle(grid), reach(grid))
    expected = area_integral(np.ones(grid.shape), grid, shape, ready.cells) / shape.area
    found = quick_numbers(field, shape, ready)
    assert 0.3 < expected < 0.99
    assert found.coverage["area"] == pytest.approx(expected, abs=1e-12)
    assert found.vorticity_integral.value is None
    assert any("of the area is not measured" in said or "passes a gap" in said for said in found.warnings)


@pytest.mark.parametrize("even", [True, False])
def test_circulation_is_the_integral_of_the_interpolants_own_curl(even):
    """Green's theorem. In a cell the interpolant's curl is linear, so centroids of triangles are exact."""
    import shapely

    rng = np.random.default_rng(5)
    grid = lattice(7, 8, even=even)
    field = random_field(grid)
    shape = star(rng, middle(grid), reach(grid))
    outline = shapely.Polygon(np.column_stack([shape.vertices.real, shape.vertices.imag]))
    curl = divergence = 0.0
    for iy in range(grid.y.size - 1):
        for ix in range(grid.x.size - 1):
            x0, x1, y0, y1 = grid.x[ix], grid.x[ix + 1], grid.y[iy], grid.y[iy + 1]
            part = shapely.intersection(outline, shapely.box(x0, y0, x1, y1))
            for triangle in shapely.constrained_delaunay_triangles(part).geoms:
                c = triangle.centroid
                a, b = (c.x - x0) / (x1 - x0), (c.y - y0) / (y1 - y0)
                d = {}
                for name, values in (("u", field.u), ("v", field.v)):
                    f = values[iy : iy + 2, ix : ix + 2]
                    d[name, "x"] = ((1 - b) * (f[0, 1] - f[0, 0]) + b * (f[1, 1] - f[1, 0])) / (x1 - x0)
                    d[name, "y"] = ((1 - a) * (f[1, 0] - f[0, 0]) + a * (f[1, 1] - f[0, 1])) / (y1 - y0)
                curl += triangle.area * (d["v", "x"] - d["u", "y"])
                divergence += triangle.area * (d["u", "x"] + d["v", "y"])
    found = measure_region(field, shape)
    scale = np.hypot(field.u, field.v).max() * shape.length
    assert abs(found.circulation.value - curl) < 1e-12 * scale
    assert abs(found.flux.value - divergence) < 1e-12 * scale


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("place", PLACEMENTS)
@pytest.mark.parametrize("line", ["bilinear", "cubic"])
def test_every_number_of_a_linear_field_is_exact(even, place, line):
    rng = np.random.default_rng(6)
    grid = placed(lattice(12, 14, even=even, seed=3), place)
    (ux, uy), (vx, vy) = gradient = ((0.7, -1.3), (2.1, 0.4))
    field = linear_field(grid, gradient, derivative="richardson")
    u_max = np.hypot(field.u, field.v).max()
    for number in range(4):
        shape = star(rng, middle(grid), reach(grid))
        if number % 2:
            shape = shapes.Polygon(shape.points[::-1])
        found = measure_region(field, shape, line=line)
        tolerance = 1e-12 * u_max * shape.length
        for name, expected in (
            ("circulation", (vx - uy) * shape.area),
            ("vorticity_integral", (vx - uy) * shape.area),
            ("closure_circulation", 0.0),
            ("flux", (ux + vy) * shape.area),
            ("divergence_integral", (ux + vy) * shape.area),
            ("closure_flux", 0.0),
        ):
            assert abs(getattr(found, name).value - expected) < tolerance, name
        assert abs(found.resolution_gap["circulation"]) < tolerance
        centre = shape.centroid
        mean = found.inside["u"]["mean"].value
        assert mean == pytest.approx(1.0 + ux * centre.real + uy * centre.imag, abs=1e-12 * u_max)
        assert found.inside["vorticity"]["mean"].value == pytest.approx(vx - uy, abs=1e-11 * u_max)


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("place", PLACEMENTS)
def test_open_line_in_a_linear_field_is_exact(even, place):
    grid = placed(lattice(12, 14, even=even, seed=3), place)
    (ux, uy), (vx, vy) = gradient = ((0.7, -1.3), (2.1, 0.4))
    field = linear_field(grid, gradient)
    z = middle(grid) + 0.9 * reach(grid) * np.array([-0.9 - 0.1j, 0.2 + 0.6j, 0.2 + 0.6j, 0.8 - 0.4j])
    shape = shapes.Line(tuple((p.real, p.imag) for p in z))
    along = across = 0.0
    for p, q in pairwise(z):
        m, d = 0.5 * (p + q), q - p
        u, v = 1.0 + ux * m.real + uy * m.imag, -2.0 + vx * m.real + vy * m.imag
        along += u * d.real + v * d.imag
        across += u * d.imag - v * d.real
    found = measure_region(field, shape)
    tolerance = 1e-12 * np.hypot(field.u, field.v).max() * shape.length
    assert abs(found.line_integral.value - along) < tolerance
    assert abs(found.cross_flow.value - across) < tolerance
    back = measure_region(field, shapes.Line(shape.points[::-1]))
    assert abs(back.line_integral.value + along) < tolerance


@pytest.mark.parametrize("offset", [0.0, 1e6])
def test_tiny_contours_keep_their_digits(offset):
    """A contour of 0.004 cell far from the running sums' start, and coordinates far from their origin."""
    grid = Grid(offset + np.arange(1000.0), np.arange(20.0))
    shape = shapes.rectangle(((offset + 900.25, 7.5), (offset + 900.25 + 2.0**-8, 7.5 + 2.0**-8)))
    arm = grid.nodes - (offset + 900 + 7j)
    field = Field(grid, u=-arm.imag, v=arm.real)
    found = measure_region(field, shape)
    assert found.vorticity_integral.value == pytest.approx(2 * 2.0**-16, rel=1e-11)
    assert found.circulation.value == pytest.approx(2 * 2.0**-16, rel=1e-10)


def test_repeated_corners_are_harmless():
    grid = lattice(12, 14)
    field = random_field(grid)
    corners = ((-2.0, 3.0), (2.1, 3.3), (0.4, 5.2))
    doubled = tuple(p for p in corners for _ in range(3))
    once, thrice = (measure_region(field, shapes.Polygon(points)) for points in (corners, doubled))
    assert thrice.circulation.value == pytest.approx(once.circulation.value, rel=1e-13)
    assert thrice.coverage["contour"] == 1.0


@pytest.mark.parametrize("noise, limit", [(0.0, 2e-8), (0.02, 1e-6)])
def test_circle_equals_its_polygon_with_four_times_the_vertices(noise, limit):
    """The promise that a circle's integrals are within 1e-6, on a smooth vortex and with 2 % noise."""
    grid = Grid(np.arange(-110.0, 111.0), np.arange(-105.0, 106.0))
    clean, rough = vortex(grid, core=40, centre=3 + 2j), random_field(grid)
    field = Field(grid, u=clean.u + noise * rough.u, v=clean.v + noise * rough.v)
    for shape in (shapes.circle((1, 0.5), 100), shapes.Ellipse((0, 1), (50, 30), 0.4)):
        fine = _with_vertices(shape, 4 * shapes.ROUND_VERTICES)
        found, finer = measure_region(field, shape), measure_region(field, fine)
        scale = np.hypot(field.u, field.v).max() * shape.length
        for name in ("circulation", "flux", "vorticity_integral"):
            assert abs(getattr(found, name).value - getattr(finer, name).value) < limit * scale, name
        assert found.circulation.value == pytest.approx(finer.circulation.value, rel=limit)
        assert fine.area == pytest.approx(shape.area, rel=1e-12)


def _with_vertices(shape: shapes.Ellipse, count: int) -> shapes.Polygon:
    step = 2 * np.pi / count
    t = step * np.arange(count)
    a, b = shape.semi_axes
    ring = np.sqrt(step / np.sin(step)) * (a * np.cos(t) + 1j * b * np.sin(t))
    z = complex(*shape.centre) + ring * np.exp(1j * shape.angle)
    return shapes.Polygon(tuple((float(p.real), float(p.imag)) for p in z))


def test_through_flow_of_a_field_without_u_and_v():
    grid = Grid(uneven(np.random.default_rng(1), 9, 0.13), uneven(np.random.default_rng(2), 7, 0.07))
    x, y = np.meshgrid(grid.x, grid.y)
    field = Field(grid, w=0.5 + 2 * x - 3 * y)
    shape = shapes.rectangle(((grid.x[0], grid.y[0]), (grid.x[-1], grid.y[-1])))
    found = measure_region(field, shape)
    centre = shape.centroid
    expected = (0.5 + 2 * centre.real - 3 * centre.imag) * shape.area
    assert found.through_flow.value == pytest.approx(expected, rel=1e-12)
    assert found.through_flow.unit == "m^3/s"
    assert found.circulation is None and found.closure_flux is None
    assert found.coverage["area"] == 1.0


def test_a_single_row_answers_lines_along_it_and_no_contour():
    grid = Grid(np.array([0.0, 1.0, 3.0]), np.array([2.0]))
    field = Field(grid, u=np.array([[1.0, 2.0, 4.0]]), v=np.array([[0.0, 1.0, 3.0]]))
    along = measure_region(field, shapes.Line(((0.0, 2.0), (3.0, 2.0))))
    assert along.line_integral.value == pytest.approx(1.5 + 6.0)
    assert along.cross_flow.value == pytest.approx(-(0.5 + 4.0))
    beside = measure_region(field, shapes.Line(((0.0, 2.1), (3.0, 2.1))))
    assert beside.line_integral.value is None and "leaves the grid" in beside.warnings[0]
    around = measure_region(field, shapes.rectangle(((0, 1.9), (3, 2.1))))
    assert around.circulation.value is None and "single row" in around.warnings[0]


def test_contours_on_grid_lines_belong_to_the_measured_cell():
    grid = Grid(np.arange(8) * 0.1, np.arange(7) * 0.1)
    missing = np.zeros(grid.shape, bool)
    missing[:2] = missing[6:] = True
    missing[:, :2] = missing[:, 6:] = True
    arm = grid.nodes
    field = Field(grid, u=np.where(missing, np.nan, -arm.imag), v=np.where(missing, np.nan, arm.real))
    found = measure_region(field, shapes.rectangle(((0.1 * 2, 0.1 * 2), (0.5, 0.1 * 5))))
    assert found.coverage["contour"] == 1.0 and found.coverage["area"] == 1.0
    assert found.circulation.value == pytest.approx(2 * 0.3 * 0.3, rel=1e-12)
    assert found.vorticity_integral.value == pytest.approx(2 * 0.3 * 0.3, rel=1e-12)


def test_the_whole_grid_is_measured_to_its_edge():
    grid = Grid(np.linspace(0.1, 0.7, 13), np.linspace(-0.3, 0.3, 7), Placement().then(turn=0.3))
    field = random_field(grid)
    corners = grid.nodes[[0, 0, -1, -1], [0, -1, -1, 0]]
    found = measure_region(field, shapes.Polygon(tuple((z.real, z.imag) for z in corners)))
    assert found.coverage["contour"] == 1.0 and found.coverage["area"] == 1.0
    assert found.circulation.value is not None


def test_null_values_carry_their_reason():
    grid = Grid(np.arange(11.0), np.arange(11.0))
    missing = np.zeros(grid.shape, bool)
    missing[5, 5] = True
    field = linear_field(grid, ((0, -1), (1, 0)), missing=missing)
    through = measure_region(field, shapes.rectangle(((1, 1), (5.5, 9))))
    assert through.circulation.value is None and through.index is None
    assert "passes a gap at (5.5, 4" in through.warnings[0]
    outside = measure_region(field, shapes.circle((9, 5), 3))
    assert outside.flux.value is None and "leaves the grid at" in outside.warnings[0]
    around = measure_region(field, shapes.circle((5, 5), 3))
    assert around.circulation.value is not None and around.vorticity_integral.value is None
    assert around.closure_circulation.value is None and around.inside == {}
    assert any("of the area is not measured" in said for said in around.warnings)
    crossing = measure_region(field, shapes.Polygon(((1, 1), (4, 4), (4, 1), (1, 4.5))))
    assert crossing.circulation.value is None and "crosses itself" in crossing.warnings[0]
    far = measure_region(field, shapes.circle((100, 100), 3))
    assert far.coverage["contour"] == 0.0 and far.coverage["area"] == 0.0


def test_an_obstacle_is_named_with_its_remedy():
    grid = Grid(np.arange(11.0), np.arange(11.0))
    status = np.zeros(grid.shape, np.uint8)
    status[5, 5] = Status.MASKED
    shape = shapes.rectangle(((1, 1), (5.5, 9)))
    absent = status > 0
    masked = measure_region(linear_field(grid, ((0, -1), (1, 0)), missing=absent, status=status), shape)
    assert "passes a gap left by the mask" in masked.warnings[0] and "clear of the mask" in masked.warnings[0]
    status[5, 5] = Status.MISSING
    missing = measure_region(linear_field(grid, ((0, -1), (1, 0)), missing=absent, status=status), shape)
    assert "passes a gap at" in missing.warnings[0] and "fill the gap" in missing.warnings[0]
    outside = measure_region(linear_field(grid, ((0, -1), (1, 0))), shapes.circle((9, 5), 3))
    assert "outermost nodes" in outside.warnings[0]


def test_a_contour_through_a_stagnation_point_has_no_index():
    """The point lies between two of the places at which the direction is looked at."""
    grid = Grid(np.arange(9.0), np.arange(9.0))
    field = linear_field(grid, ((0, -1 / 1.3), (1, 0)))  # at rest at (2, 1.3)
    through = measure_region(field, shapes.rectangle(((2.0, 0.5), (6.0, 5.0))))
    assert through.index is None and any("vanishes on the contour" in said for said in through.warnings)


def test_quick_and_full_numbers_are_the_same():
    grid = lattice(20, 22)
    field = vortex(grid, core=1.0, centre=middle(grid))
    shape = shapes.circle((middle(grid).real, middle(grid).imag), 2.0)
    ready = prepare(field)
    for line in ("bilinear", "cubic"):
        quick = quick_numbers(field, shape, ready, line=line)
        full = measure_region(field, shape, line=line)
        for name, number in full.numbers().items():
            assert getattr(quick, name).value == number.value, name
