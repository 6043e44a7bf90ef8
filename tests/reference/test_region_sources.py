"""Region numbers against published flows, worked examples and general-purpose libraries."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import shapely
import sympy
from scipy.integrate import dblquad, quad
from scipy.interpolate import RectBivariateSpline
from skimage.measure import find_contours, points_in_poly, subdivide_polygon

from fieldview.compute.covariance import functional_covariance, functional_variance
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.compute.region import measure_region
from fieldview.compute.shapes import Line, Polygon, circle, rectangle

AXIS = np.arange(-40, 41) * 0.25
XX, YY = np.meshgrid(AXIS, AXIS)
Z = XX + 1j * YY


def flow_of(velocity: np.ndarray) -> Field:
    """A field of u + iv at the nodes."""
    return Field(Grid(AXIS, AXIS), u=velocity.real.copy(), v=velocity.imag.copy())


def polygon(*corners) -> Polygon:
    return Polygon(tuple((float(z.real), float(z.imag)) for z in map(complex, corners)))


# Potential flow: complex velocity u - iv = (m - i Γ0) / (2π z) of a line source m and a vortex Γ0; Φ = m and
# Potential flow: complex velocity u - iv = (m - i Γ0) / (2π z) of a line source m and a vortex Γ0; Φ is m and
# from memory)


@pytest.mark.parametrize("where", [0.1 + 0.05j, -1.3 + 2.2j])
def test_line_source_and_vortex_enclosed_or_not(where):
    source, vortex = 2.0, -3.0
    field = flow_of(np.conj((source - 1j * vortex) / (2 * np.pi * (Z - where))))
    around = measure_region(field, circle((where.real, where.imag), 4.0))
    # 16 cells from the singular point the interpolation error is some 1e-5 of the value
    assert around.circulation.value == pytest.approx(vortex, rel=1e-4)
    assert around.flux.value == pytest.approx(source, rel=1e-4)
    beside = measure_region(field, polygon(4 - 5j, 8 - 4j, 7 + 3j, 4.5 + 4j))
    assert abs(beside.circulation.value) < 1e-4 and abs(beside.flux.value) < 1e-4


def test_stream_past_a_circular_cylinder_with_circulation():
    """Milne-Thomson (1968), Theoretical Hydrodynamics, circle theorem; from memory."""
    stream, radius, vortex = 1.0, 1.5, 4.0
    inside = np.abs(Z) < radius - 0.75
    safe = np.where(inside, 1.0, Z)
    velocity = np.conj(stream * (1 - radius**2 / safe**2) - 1j * vortex / (2 * np.pi * safe))
    field = flow_of(np.where(inside, np.nan, velocity))
    numbers = measure_region(field, circle((0, 0), 4.0))
    assert numbers.circulation.value == pytest.approx(vortex, rel=2e-4)
    assert abs(numbers.flux.value) < 1e-4 * vortex
    assert numbers.vorticity_integral.value is None  # its area is not all measured


@pytest.mark.parametrize("ratio", [0.5, 1.0, 1.12091, 1.5, 3.0])
def test_lamb_oseen_vortex(ratio):
    """circulation(r) = total (1 - exp(-r^2/core^2)); the speed peaks at 1.12091 cores (recomputed)."""
    core = 2.5  # ten cells
    turn = -np.expm1(-(np.abs(Z) ** 2) / core**2) / np.where(Z == 0, 1, 2 * np.pi * np.abs(Z) ** 2)
    field = flow_of(1j * Z * turn)
    gamma = measure_region(field, circle((0, 0), ratio * core)).circulation.value
    assert gamma == pytest.approx(-np.expm1(-(ratio**2)), rel=6e-3)
    cubic = measure_region(field, circle((0, 0), ratio * core), line="cubic").circulation.value
    assert cubic == pytest.approx(-np.expm1(-(ratio**2)), rel=3e-4)


# Index of a closed contour (Poincaré): sum of the indices of the critical points inside; any textbook of
# differential equations, from memory


@pytest.mark.parametrize(
    ("velocity", "index"),
    [
        (Z, 1), (-Z, 1), (1j * Z, 1), ((1 + 2j) * Z, 1),  # node, sink, centre, focus
        (np.conj(Z), -1),  # saddle
        (Z**2, 2), (np.conj(Z) ** 2, -2),  # dipole, monkey saddle
        (np.full_like(Z, 1 + 1j), 0),
        ((Z - 2) * np.conj(Z + 2), 0), ((Z - 2) * (Z + 2), 2),
    ],
)  # fmt: skip
def test_index_is_the_sum_of_the_critical_points_inside(velocity, index):
    from fieldview.compute.error_model import ErrorModel

    error = ErrorModel(sigma={"u": 1e-9, "v": 1e-9}, origin="given", correlation_stated=True)
    field = flow_of(velocity).with_(error=error)
    assert measure_region(field, circle((0.03, 0.07), 6.0)).index == index


# Correlated inputs: JCGM 100:2008 (GUM), example H.2, five observations of V, I and φ (table H.2). The
# covariances of the means go through our functional of a row of nodes.

VOLTS = np.array([5.007, 4.994, 5.005, 4.990, 4.999])
AMPERES = np.array([19.663, 19.639, 19.640, 19.685, 19.678]) * 1e-3
RADIANS = np.array([1.0456, 1.0438, 1.0468, 1.0428, 1.0433])


def test_correlated_inputs_of_the_gum():
    v, i, phi = sympy.symbols("v i phi")
    outputs = (v / i * sympy.cos(phi), v / i * sympy.sin(phi), v / i)
    means = [float(np.mean(x)) for x in (VOLTS, AMPERES, RADIANS)]
    slopes = [
        [float(sympy.diff(output, s).subs(dict(zip((v, i, phi), means, strict=True)))) for s in (v, i, phi)]
        for output in outputs
    ]
    # C = S'S/20: the functional of an output on five independent unit errors
    deviations = np.stack([x - x.mean() for x in (VOLTS, AMPERES, RADIANS)]) / np.sqrt(20)
    weights = [(np.array(slope) @ deviations)[None, :] for slope in slopes]
    sigma = np.ones((1, 5))
    u = [functional_variance(w, sigma, (1.0, 1.0)) ** 0.5 for w in weights]
    values = [float(output.subs(dict(zip((v, i, phi), means, strict=True)))) for output in outputs]
    assert values == pytest.approx([127.732, 219.847, 254.260], abs=5e-4)
    assert u == pytest.approx([0.071, 0.295, 0.236], abs=6e-4)
    for (a, b), r in {(0, 1): -0.588, (0, 2): -0.485, (1, 2): 0.993}.items():
        found = functional_covariance(weights[a], weights[b], sigma, (1.0, 1.0)) / (u[a] * u[b])
        assert found == pytest.approx(r, abs=1.5e-3)


def test_green_s_theorem_in_closed_form():
    """sympy integrates curl and divergence of a bilinear flow, its own interpolant, over a rectangle."""
    x, y = sympy.symbols("x y")
    u, v = 0.3 * x * y - 0.2 * x + 0.1, -0.4 * x * y + 0.5 * y
    bounds = ((x, sympy.Rational(-3, 2), 2), (y, -1, sympy.Rational(7, 4)))
    curl = sympy.integrate(sympy.diff(v, x) - sympy.diff(u, y), *bounds)
    spread = sympy.integrate(sympy.diff(u, x) + sympy.diff(v, y), *bounds)
    field = flow_of(0.3 * XX * YY - 0.2 * XX + 0.1 + 1j * (-0.4 * XX * YY + 0.5 * YY))
    numbers = measure_region(field, rectangle(((-1.5, -1), (2, 1.75))))
    for name, truth in (
        ("circulation", curl),
        ("vorticity_integral", curl),
        ("flux", spread),
        ("divergence_integral", spread),
    ):
        assert getattr(numbers, name).value == pytest.approx(float(truth), rel=1e-12), name


def test_scipy_integrates_the_flow_itself():
    """quad along the line and dblquad over the area of a smooth flow, not of its interpolant."""

    def u(x, y):
        return np.sin(0.3 * x) * np.cos(0.2 * y)

    def v(x, y):
        return np.cos(0.25 * x + 0.1 * y)

    field = flow_of(u(XX, YY) + 1j * v(XX, YY))
    a, b = -4 - 3j, 5 + 2j
    along = quad(lambda t: u(*_at(a, b, t)) * (b - a).real + v(*_at(a, b, t)) * (b - a).imag, 0, 1)[0]
    across = quad(lambda t: u(*_at(a, b, t)) * (b - a).imag - v(*_at(a, b, t)) * (b - a).real, 0, 1)[0]
    cut = measure_region(field, Line(((-4.0, -3.0), (5.0, 2.0))))
    assert cut.line_integral.value == pytest.approx(along, rel=2e-3)
    assert cut.cross_flow.value == pytest.approx(across, rel=2e-3)
    cubic = measure_region(field, Line(((-4.0, -3.0), (5.0, 2.0))), line="cubic")
    assert cubic.line_integral.value == pytest.approx(along, rel=2e-5)
    flow = dblquad(lambda y, x: np.exp(-0.1 * (x**2 + y**2)), -2, 3, -1, 2.5)[0]
    through = Field(Grid(AXIS, AXIS), w=np.exp(-0.1 * (XX**2 + YY**2)))
    assert measure_region(through, rectangle(((-2, -1), (3, 2.5)))).through_flow.value == pytest.approx(
        flow, rel=2e-3
    )


def _at(a: complex, b: complex, t: float) -> tuple[float, float]:
    z = a + t * (b - a)
    return z.real, z.imag


def test_the_bilinear_interpolant_is_scipy_s():
    """A spline of degree one through the same nodes, integrated along the contour by Gauss's rule."""
    rng = np.random.default_rng(2)
    u, v = rng.normal(size=(2, *XX.shape))
    corners = np.array([-3.3 - 4.1j, 5.2 - 2.7j, 3.9 + 4.4j, -4.6 + 2.2j])
    of_u, of_v = (RectBivariateSpline(AXIS, AXIS, part, kx=1, ky=1) for part in (u, v))
    points, weights = np.polynomial.legendre.leggauss(3)
    total = 0.0
    for p, q in zip(corners, np.roll(corners, -1), strict=True):
        cuts = np.unique(np.concatenate([[0, 1], *(((AXIS - s) / d) for s, d in
                         ((p.real, (q - p).real), (p.imag, (q - p).imag)))]))  # fmt: skip
        cuts = cuts[(cuts >= 0) & (cuts <= 1)]
        for start, stop in pairwise(cuts):
            z = p + (0.5 * (start + stop) + 0.5 * (stop - start) * points) * (q - p)
            values = of_u.ev(z.imag, z.real) * (q - p).real + of_v.ev(z.imag, z.real) * (q - p).imag
            total += 0.5 * (stop - start) * float(weights @ values)
    found = measure_region(flow_of(u + 1j * v), polygon(*corners)).circulation.value
    assert found == pytest.approx(total, rel=1e-11)


def test_shapely_agrees_on_area_and_length():
    shape = polygon(-3.3 - 4.1j, 5.2 - 2.7j, 3.9 + 4.4j, 0.5 + 1j, -4.6 + 2.2j)
    outline = shapely.Polygon([(z.real, z.imag) for z in shape.vertices])
    numbers = measure_region(flow_of(1j * Z), shape)
    assert numbers.area.value == pytest.approx(outline.area, rel=1e-13)
    assert numbers.length.value == pytest.approx(outline.length, rel=1e-13)
    # solid-body rotation: twice the area
    assert numbers.circulation.value == pytest.approx(2 * outline.area, rel=1e-12)


def test_scikit_image_agrees_on_the_nodes_inside():
    """Least and greatest value inside, against the nodes that scikit-image finds in the polygon."""
    values = np.random.default_rng(4).normal(size=XX.shape)
    shape = polygon(-3.31 - 4.12j, 5.23 - 2.74j, 3.92 + 4.41j, 0.53 + 1.07j, -4.64 + 2.21j)
    corners = np.column_stack([shape.vertices.real, shape.vertices.imag])
    inside = points_in_poly(np.column_stack([XX.ravel(), YY.ravel()]), corners).reshape(XX.shape)
    found = measure_region(Field(Grid(AXIS, AXIS), w=values), shape).inside["w"]
    assert found["min"].value == values[inside].min() and found["max"].value == values[inside].max()


def test_scikit_image_s_iso_line_of_the_stream_function_is_no_path_for_flow():
    """Across a closed streamline, found by scikit-image, nothing flows."""
    stream = np.exp(-((XX / 4) ** 2) - (YY / 2.5) ** 2)
    slope_y, slope_x = (np.gradient(stream, 0.25, axis=axis, edge_order=2) for axis in (0, 1))
    (line,) = find_contours(stream, 0.6)
    line = subdivide_polygon(line[::4], degree=1)[:-1]
    corners = tuple((float(AXIS[0] + 0.25 * c), float(AXIS[0] + 0.25 * r)) for r, c in line)
    numbers = measure_region(flow_of(slope_y - 1j * slope_x), Polygon(corners))
    assert abs(numbers.flux.value) < 2e-3 * abs(numbers.circulation.value)


def test_cubic_convolution_of_keys():
    """Keys (1981), IEEE Trans. ASSP 29:1153-1160: exact for quadratics, third order for anything smooth."""
    field = flow_of(0.2 * XX**2 - 0.1 * XX * YY + 0.05 * YY**2 + 1j * (0.3 * XX * YY - 0.15 * YY**2))
    shape = polygon(-3.3 - 4.1j, 5.2 - 2.7j, 3.9 + 4.4j, -4.6 + 2.2j)
    outline = shapely.Polygon([(z.real, z.imag) for z in shape.vertices])
    # curl = 0.3 y - (-0.1 x + 0.1 y): linear, so its integral is area times its value at the centroid
    c = outline.centroid
    truth = outline.area * (0.2 * c.y + 0.1 * c.x)
    found = measure_region(field, shape, line="cubic").circulation.value
    assert found == pytest.approx(truth, rel=1e-11)
    errors = []
    for cells in (20, 40):
        axis = np.linspace(-10, 10, 2 * cells + 1)
        x, y = np.meshgrid(axis, axis)
        smooth = Field(Grid(axis, axis), u=np.sin(0.5 * x) * np.cos(0.4 * y), v=np.zeros_like(x))
        line = Line(((-6.1, -5.3), (5.7, 6.2)))
        exact = quad(
            lambda t: np.sin(0.5 * (-6.1 + 11.8 * t)) * np.cos(0.4 * (-5.3 + 11.5 * t)) * 11.8, 0, 1
        )[0]
        errors.append(abs(measure_region(smooth, line, line="cubic").line_integral.value - exact))
    assert errors[1] < errors[0] / 6
