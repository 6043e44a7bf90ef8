"""Random, systematic and gap parts of a region's uncertainty."""

import numpy as np
import pytest

from fieldview.compute import shapes
from fieldview.compute.axes import remove_mean, turn_axes
from fieldview.compute.error_model import ErrorModel, Systematic
from fieldview.compute.field import Event, Field, Status
from fieldview.compute.filling import fill_map
from fieldview.compute.grid import Grid
from fieldview.compute.region import measure_region, prepare, quick_numbers
from fieldview.compute.smoothing import smoothing_map
from fieldview.compute.units import PIXEL
from tests.compute.contours import middle, reach, star
from tests.compute.flows import correlated_noise, lattice, stated, vortex

SIGMA, STEP = 0.03, 0.5


def still(grid: Grid, error: ErrorModel, **attributes) -> Field:
    return Field(grid, u=np.zeros(grid.shape), v=np.zeros(grid.shape), error=error, **attributes)


@pytest.mark.parametrize("n, k", [(1, 1), (2, 2), (5, 5), (4, 7), (12, 3)])
def test_closed_forms_on_node_aligned_rectangles(n, k):
    """sigma Delta sqrt(2(n + k - 1)) for m = 1; sqrt(2(2n + 2k - 3)) for m = 2, where n, k > 1: project."""
    grid = Grid(np.arange(20) * STEP, np.arange(20) * STEP)
    shape = shapes.rectangle(((3 * STEP, 4 * STEP), ((3 + n) * STEP, (4 + k) * STEP)))
    independent = measure_region(still(grid, stated(SIGMA)), shape)
    assert independent.circulation.random == pytest.approx(SIGMA * STEP * np.sqrt(2 * (n + k - 1)), rel=1e-9)
    assert independent.flux.random == pytest.approx(independent.circulation.random, rel=1e-12)
    if min(n, k) > 1:
        found = measure_region(still(grid, stated(SIGMA, correlation=(2, 2))), shape)
        assert found.circulation.random == pytest.approx(
            SIGMA * STEP * np.sqrt(2 * (2 * n + 2 * k - 3)), rel=1e-9
        )


NAMES = ("circulation", "flux", "vorticity_integral", "closure_flux")


def functionals(field: Field, shape, line: str) -> dict[str, dict[str, np.ndarray]]:
    """Weights (ny * nx,) of numbers on the measured values, found by changing one vector after the other.

    The field's values are all 0, so that its maps may be applied to the change alone.
    """
    size = field.status.size
    weights = {name: {component: np.zeros(size) for component in "uv"} for name in NAMES}
    for component in "uv":
        for node in range(size):
            change = np.zeros(size)
            change[node] = 1.0
            for step in field.maps:
                change = step.forward(change)
            changed = field.with_(**{component: change.reshape(field.grid.shape)})
            numbers = quick_numbers(changed, shape, prepare(changed), line=line)
            for name in NAMES:
                weights[name][component][node] = getattr(numbers, name).value
    return weights


def coefficients(grid: Grid, correlation) -> np.ndarray:
    iy, ix = np.divmod(np.arange(grid.x.size * grid.y.size), grid.x.size)
    rho = 1.0
    for place, nodes in ((ix, correlation[0]), (iy, correlation[1])):
        rho = rho * np.maximum(0, 1 - np.abs(place[:, None] - place[None, :]) / nodes)
    return rho


CASES = {
    "plain": ((1.0, 1.0), "bilinear", ()),
    "correlated": ((2.0, 3.0), "cubic", ()),
    "broken lengths": ((2.5, 1.6), "bilinear", ()),
    "filled": ((2.0, 2.0), "bilinear", ("fill",)),
    "filled and smoothed": ((2.0, 2.0), "bilinear", ("fill", "smooth")),
    "mean taken off": ((2.0, 2.0), "cubic", ("fill", "mean")),
    "penalised": ((1.5, 2.0), "bilinear", ("penalised",)),
}


@pytest.mark.parametrize("case", CASES)
def test_random_part_equals_the_dense_matrix_product(case):
    """JCGM 102: weights found one vector at a time, times the full covariance matrix with a sigma map."""
    correlation, line, steps = CASES[case]
    grid = lattice(9, 10, even=False, seed=5)
    rng = np.random.default_rng(8)
    sigma = {name: rng.uniform(0.5, 2.0, grid.shape) for name in ("u", "v")}
    missing = np.zeros(grid.shape, bool)
    if "fill" in steps:
        missing[4, 3] = missing[4, 4] = missing[2, 6] = True

    still_values = np.where(missing, np.nan, 0.0)
    error = stated(sigma, correlation=correlation)
    field = cleaned(Field(grid, u=still_values, v=still_values, error=error), missing, steps)
    shape = star(rng, middle(grid), 0.7 * reach(grid))
    found = measure_region(field, shape, line=line)
    rho = coefficients(grid, correlation)
    covariance = {name: rho * np.outer(s, s) for name, s in ((n, sigma[n].ravel()) for n in "uv")}
    weights = functionals(field, shape, line)
    for name, by_component in weights.items():
        expected = sum(w @ covariance[c] @ w for c, w in by_component.items())
        assert getattr(found, name).random ** 2 == pytest.approx(expected, rel=1e-9), name
    gamma, phi = weights["circulation"], weights["flux"]
    expected = sum(gamma[c] @ covariance[c] @ phi[c] for c in "uv")
    assert found.covariance == pytest.approx(expected, rel=1e-8, abs=1e-9 * found.circulation.random**2)


def cleaned(field: Field, missing: np.ndarray, steps) -> Field:
    for step in steps:
        if step == "fill":
            change = fill_map(field.grid, field.valid, missing, method="linear")
            field = field.mapped(change, np.where(change.filled, Status.FILLED, field.status))
        elif step == "smooth":
            change = smoothing_map(field.grid, field.valid, method="gaussian", width=0.8)
            field = field.mapped(change, field.status)
        elif step == "penalised":
            change = smoothing_map(field.grid, field.valid, method="penalised", width=4.0)
            field = field.mapped(change, field.status)
        else:
            field = remove_mean(field)
    return field


def test_through_flow_and_means_follow_the_error_model():
    grid = lattice(9, 10, even=False, seed=5)
    rng = np.random.default_rng(9)
    sigma = {name: rng.uniform(0.5, 2.0, grid.shape) for name in "uvw"}
    shape = star(rng, middle(grid), 0.7 * reach(grid))
    rho = coefficients(grid, (2.0, 3.0))

    def make(w):
        error = stated(sigma, correlation=(2.0, 3.0))
        return Field(grid, u=w, v=np.zeros(grid.shape), w=w, error=error)

    weights = np.zeros(rho.shape[0])
    for node in range(weights.size):
        bumped = np.zeros(weights.size)
        bumped[node] = 1.0
        changed = make(bumped.reshape(grid.shape))
        weights[node] = quick_numbers(changed, shape, prepare(changed)).through_flow.value
    found = measure_region(make(np.zeros(grid.shape)), shape)
    for name, number, scale in (
        ("w", found.through_flow, 1.0),
        ("w", found.inside["w"]["mean"], 1 / shape.area),
        ("u", found.inside["u"]["mean"], 1 / shape.area),
    ):
        s = sigma[name].ravel()
        expected = scale**2 * weights @ (rho * np.outer(s, s)) @ weights
        assert number.random**2 == pytest.approx(expected, rel=1e-9)
    assert weights.sum() == pytest.approx(shape.area, rel=1e-12)


def test_turned_axes_leave_the_uncertainty_as_it_was():
    """sigma_u and sigma_v differ and stay with the axes they were stated for."""
    grid = lattice(12, 13)
    clean = vortex(grid, core=1.0, centre=middle(grid))
    field = Field(grid, u=clean.u, v=clean.v, error=stated({"u": 0.01, "v": 0.05}, correlation=(2, 2)))
    centre = middle(grid)
    shape = shapes.Polygon(
        tuple((float(z.real), float(z.imag)) for z in centre + np.array([-2 - 1j, 2 - 1.2j, 1.5 + 0.4j]))
    )
    before = measure_region(field, shape)
    for reflect, turn in ((None, 0.6), ("x", -1.1), ("y", 2.0)):
        turned = turn_axes(field, angle=turn, about=0.3j, reflect=reflect)
        z = turned.grid.placement.to_plane(shape.vertices)
        after = measure_region(turned, shapes.Polygon(tuple((float(p.real), float(p.imag)) for p in z)))
        sign = -1 if reflect else 1
        assert after.circulation.value == pytest.approx(sign * before.circulation.value, rel=1e-12)
        assert after.circulation.random == pytest.approx(before.circulation.random, rel=1e-10)
        assert after.flux.random == pytest.approx(before.flux.random, rel=1e-10)
        assert after.covariance == pytest.approx(sign * before.covariance, rel=1e-8)
        assert after.vorticity_integral.random == pytest.approx(before.vorticity_integral.random, rel=1e-9)
    assert before.flux.random != pytest.approx(before.circulation.random, rel=1e-3)


@pytest.mark.parametrize("m", [1, 2, 4])
def test_spread_of_noise_equals_the_stated_random_part(m):
    """1,000 realisations of clean correlated noise through the function that drags use."""
    rng = np.random.default_rng(100 + m)
    grid = Grid(np.arange(30.0), np.arange(28.0))
    error = stated(SIGMA, correlation=(m, m))
    clean = vortex(grid, core=5.0, centre=14.3 + 13.6j)
    shape = shapes.circle((14.3, 13.6), 8.0)
    found = np.array(
        [
            _line_numbers(Field(grid, u=clean.u + noise[0], v=clean.v + noise[1], error=error), shape)
            for noise in SIGMA * correlated_noise(rng, grid.shape, (m, m), 2000).reshape(1000, 2, *grid.shape)
        ]
    )
    stated_parts = quick_numbers(clean.with_(error=error), shape, prepare(clean.with_(error=error)))
    for values, number in zip(found.T, (stated_parts.circulation, stated_parts.flux), strict=True):
        assert values.std(ddof=1) == pytest.approx(number.random, rel=0.1)


def _line_numbers(field, shape):
    numbers = quick_numbers(field, shape, prepare(field))
    return numbers.circulation.value, numbers.flux.value


SYSTEMATIC = Systematic(scale=0.003, pulse_separation=0.001, gain=0.02, axis_tilt=0.004, zero_offset=0.05)


def parts(number) -> dict:
    return {part.name: part for part in number.budget}


def test_sensitivities_of_the_systematic_parts():
    grid = lattice(20, 22)
    centre = middle(grid)
    clean = vortex(grid, core=1.0, centre=centre)
    field = Field(
        grid,
        u=clean.u + 0.3,
        v=clean.v,
        w=clean.u,
        error=stated(dict.fromkeys("uvw", SIGMA), systematic=SYSTEMATIC),
    )
    closed = measure_region(field, shapes.circle((centre.real, centre.imag), 2.0))
    for name, power in (("circulation", 2), ("vorticity_integral", 2), ("through_flow", 3)):
        number = getattr(closed, name)
        budget = parts(number)
        assert budget["scale"].sensitivity == pytest.approx(power * number.value)
        assert budget["scale"].uncertainty == pytest.approx(power * abs(number.value) * 0.003)
        assert budget["pulse_separation"].uncertainty == pytest.approx(abs(number.value) * 0.001)
        assert budget["gain"].uncertainty == pytest.approx(abs(number.value) * 0.02)
        assert budget["axis_tilt"].uncertainty == 0.0
    assert parts(closed.circulation)["zero_offset"].uncertainty == 0.0
    assert parts(closed.through_flow)["zero_offset"].uncertainty == pytest.approx(closed.area.value * 0.05)
    mean = parts(closed.inside["vorticity"]["mean"])
    assert mean["scale"].uncertainty == 0.0 and mean["pulse_separation"].uncertainty > 0
    z = centre + np.array([-1.5 - 1j, 0.4 + 1j, 1.5 + 0.3j])
    cut = measure_region(field, shapes.Line(tuple((p.real, p.imag) for p in z)))
    assert parts(cut.cross_flow)["axis_tilt"].uncertainty == pytest.approx(
        abs(cut.line_integral.value) * 0.004
    )
    assert parts(cut.line_integral)["axis_tilt"].uncertainty == pytest.approx(
        abs(cut.cross_flow.value) * 0.004
    )
    assert parts(cut.line_integral)["zero_offset"].uncertainty == pytest.approx(abs(z[-1] - z[0]) * 0.05)


def test_a_common_tilt_and_offset_change_an_open_line_as_stated():
    """Against the field with its vectors turned, and shifted, by the uncertain amount."""
    grid = lattice(20, 22)
    centre = middle(grid)
    clean = vortex(grid, core=1.0, centre=centre)
    z = centre + np.array([-1.5 - 1j, 0.4 + 1j, 1.5 + 0.3j])
    shape = shapes.Line(tuple((p.real, p.imag) for p in z))
    before = measure_region(clean.with_(error=stated(SIGMA, systematic=SYSTEMATIC)), shape)
    turned = (clean.u + 1j * clean.v) * np.exp(1j * 0.004)
    after = measure_region(Field(grid, u=turned.real, v=turned.imag), shape)
    change = abs(after.cross_flow.value - before.cross_flow.value)
    assert parts(before.cross_flow)["axis_tilt"].uncertainty == pytest.approx(change, rel=0.01)
    offsets = [
        measure_region(Field(grid, u=clean.u + b.real, v=clean.v + b.imag), shape) for b in (0.05, 0.05j)
    ]
    change = np.hypot(*(o.line_integral.value - before.line_integral.value for o in offsets))
    assert parts(before.line_integral)["zero_offset"].uncertainty == pytest.approx(change, rel=1e-9)


def test_pixels_feel_no_scale_and_a_stated_zero_is_known():
    grid = lattice(12, 13)
    error = stated(SIGMA, systematic=Systematic(gain=0.0))
    clean = vortex(grid, core=1.0, centre=middle(grid))
    shape = shapes.circle((middle(grid).real, middle(grid).imag), 1.5)
    found = measure_region(clean.with_(error=error, units=PIXEL), shape)
    assert parts(found.circulation)["scale"].uncertainty == 0.0
    assert parts(found.circulation)["gain"].uncertainty == 0.0
    assert not any("not stated and left out" in said for said in found.warnings)
    metric = measure_region(clean.with_(error=error), shape)
    assert parts(metric.circulation)["scale"].uncertainty is None
    said = [w for w in metric.warnings if "not stated and left out" in w]
    assert said == [
        "not stated and left out of the combined uncertainty: scale, pulse separation, zero offset, axis tilt"
    ] or said == ["not stated and left out of the combined uncertainty: scale, pulse separation"]


def test_without_a_sigma_nothing_is_combined():
    grid = lattice(12, 13)
    clean = vortex(grid, core=1.0, centre=middle(grid))
    shape = shapes.circle((middle(grid).real, middle(grid).imag), 1.5)
    found = measure_region(clean, shape)
    assert found.circulation.random is None and found.circulation.combined is None
    assert any("no sigma is stated" in said for said in found.warnings)
    assert found.covariance is None
    bound = measure_region(clean.with_(error=ErrorModel(sigma={"u": 0.1, "v": 0.1}, origin="given")), shape)
    assert bound.circulation.random > 0
    assert any("lower bound" in said for said in bound.warnings)


def lamb_oseen(cells: float, *, window: float = 0.0, size: int = 41) -> tuple[Field, complex]:
    """A vortex of core radius ``cells``, averaged over a square window by Gauss points; spacing 1."""
    grid = Grid(np.arange(float(size)), np.arange(float(size)))
    centre = 0.5 * (size - 1) + 0.3 + 0.2j + 0.5j * (size - 1)
    points, weights = np.polynomial.legendre.leggauss(6)
    velocity = np.zeros(grid.shape, complex)
    for wy, y in zip(0.5 * weights, 0.5 * window * points, strict=True):
        for wx, x in zip(0.5 * weights, 0.5 * window * points, strict=True):
            part = vortex(Grid(grid.x + x, grid.y + y), core=cells, centre=centre)
            velocity += wx * wy * (part.u + 1j * part.v)
    return Field(grid, u=velocity.real, v=velocity.imag), centre


@pytest.mark.parametrize("cells, loss, tolerance", [(3, 0.042, 0.2), (5, 0.016, 0.1)])
def test_window_gap_tells_the_loss_to_the_window(cells, loss, tolerance):
    """Loss of the circulation at one core radius for a window of two cells, as in the project's methods.

    The estimate is made of averaged values and second differences, so it comes out low on coarse cores.
    """
    clean, centre = lamb_oseen(cells)
    averaged, _ = lamb_oseen(cells, window=2.0)
    shape = shapes.circle((centre.real, centre.imag), float(cells))
    truth, measured = (
        measure_region(clean, shape, line="cubic"),
        measure_region(averaged, shape, line="cubic"),
    )
    lost = measured.circulation.value - truth.circulation.value
    assert lost / truth.circulation.value == pytest.approx(-loss, abs=0.002)
    found = measure_region(averaged.with_(error=stated(1e-9, window=(2.0, 2.0))), shape)
    assert found.window_gap["circulation"] == pytest.approx(lost, rel=tolerance)
    part = parts(found.circulation)["window"]
    assert part.uncertainty == pytest.approx(abs(found.window_gap["circulation"]) / np.sqrt(3), rel=1e-6)


def test_window_gap_is_null_where_the_window_is_as_large_as_the_structure():
    averaged, centre = lamb_oseen(3, window=5.0)
    shape = shapes.circle((centre.real, centre.imag), 3.0)
    wide = measure_region(averaged.with_(error=stated(0.01, window=(5.0, 5.0))), shape)
    assert wide.window_gap["circulation"] is None
    assert any("not estimable" in said for said in wide.warnings)
    assert parts(wide.circulation)["window"].uncertainty is None
    point = measure_region(averaged.with_(error=stated(0.01, window=(0.0, 0.0))), shape)
    assert parts(point.circulation)["window"].uncertainty == 0.0
    unknown = measure_region(averaged.with_(error=stated(0.01)), shape)
    assert unknown.window_gap["circulation"] is None
    assert any("window is not stated" in said for said in unknown.warnings)


def test_resolution_gap_tells_what_the_bilinear_line_misses():
    clean, centre = lamb_oseen(4)
    shape = shapes.circle((centre.real, centre.imag), 4.0)
    strength = 2 * np.pi * 4.0 / 0.63817 * -np.expm1(-1.0)
    found = measure_region(clean.with_(error=stated(1e-9)), shape)
    missed = strength - found.circulation.value
    assert abs(missed) > 0.005 * strength
    assert found.resolution_gap["circulation"] == pytest.approx(missed, rel=0.15)
    cubic = measure_region(clean.with_(error=stated(1e-9)), shape, line="cubic")
    assert cubic.resolution_gap == found.resolution_gap
    assert abs(cubic.circulation.value - strength) < 0.15 * abs(missed)


def test_gaps_that_are_mere_noise_add_nothing_on_average():
    """On pure noise the gaps are noise that the random part holds already."""
    rng = np.random.default_rng(12)
    grid = Grid(np.arange(24.0), np.arange(24.0))
    error = stated(SIGMA, window=(2.0, 2.0))
    added = []
    for _ in range(60):
        u, v = SIGMA * rng.normal(size=(2, *grid.shape))
        number = measure_region(
            Field(grid, u=u, v=v, error=error), shapes.circle((11.5, 11.5), 6.0)
        ).circulation
        added.append(number.gaps / number.random)
    assert np.sqrt(np.mean(np.square(added))) < 0.35


def with_gap(field: Field, nodes, method="linear") -> Field:
    lost = np.zeros(field.grid.shape, bool)
    for node in nodes:
        lost[node] = True
    field = field.reject(lost, Event(0, "hand_edit", "rejected", lost))
    change = fill_map(field.grid, field.valid, lost, method=method, values=field.components)
    return field.mapped(change, np.where(change.filled, Status.FILLED, field.status))


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("method", ["linear", "harmonic", "local_median"])
def test_filling_part_is_of_the_size_of_the_bias(even, method):
    """Over many gaps the bias in terms of its stated uncertainty has a root mean square of about one."""
    rng = np.random.default_rng(21)
    grid = lattice(30, 32, even=even)
    centre = middle(grid)
    clean = vortex(grid, core=1.4, centre=centre, error=stated(1e-6))
    shape = shapes.circle((centre.real, centre.imag), 2.0)
    truth = measure_region(clean, shape).circulation.value
    on_line = np.abs(np.abs(grid.nodes - centre) - 2.0) < 0.35
    ratios = []
    for _ in range(15):
        nodes = [tuple(n) for n in rng.permutation(np.argwhere(on_line))[:4]]
        found = measure_region(with_gap(clean, nodes, method), shape)
        part = parts(found.circulation)["filling"].uncertainty
        ratios.append((found.circulation.value - truth) / part)
    assert 0.4 < np.sqrt(np.mean(np.square(ratios))) < 2.5


def test_filling_part_is_zero_without_filled_vectors_and_null_without_surroundings():
    grid = lattice(30, 32)
    centre = middle(grid)
    clean = vortex(grid, core=1.4, centre=centre, error=stated(1e-6))
    shape = shapes.circle((centre.real, centre.imag), 2.0)
    assert parts(measure_region(clean, shape).circulation)["filling"].uncertainty == 0.0
    few = Grid(np.arange(6.0), np.arange(6.0))
    small = vortex(few, core=2.0, centre=2.4 + 2.4j, error=stated(1e-6))
    nodes = [(2, 2), (2, 3), (3, 2), (3, 3), (2, 4), (4, 2)]
    found = measure_region(with_gap(small, nodes), shapes.rectangle(((1.2, 1.2), (3.3, 3.7))))
    assert parts(found.circulation)["filling"].uncertainty is None
    assert any("bias of filled vectors is not known" in said for said in found.warnings)
    assert found.coverage["filled"] > 0.9
