"""Uncertainty maps: against dense linear algebra where exact, against perturbation where of first order."""

import numpy as np
import pytest

from fieldview.compute.axes import remove_mean, turn_axes
from fieldview.compute.derivatives import SCHEMES, derivative_rows
from fieldview.compute.error_model import ErrorModel
from fieldview.compute.field import Field, Status
from fieldview.compute.filling import fill_map
from fieldview.compute.linear import MeanRemoval
from fieldview.compute.quantities import QUANTITIES, quantity, quantity_map
from fieldview.compute.smoothing import smoothing_map
from tests.compute.flows import correlated_noise, lattice, stated, vortex

SHAPE = (9, 10)


def measured_covariance(field: Field, component: str) -> np.ndarray:
    """C_ij = sigma_i sigma_j rho(i - j), dense, from the definition in the error model."""
    ny, nx = field.grid.shape
    mx, my = field.error.correlation
    rho = [
        np.maximum(0, 1 - np.abs(np.subtract.outer(np.arange(size), np.arange(size))) / nodes)
        for size, nodes in ((ny, my), (nx, mx))
    ]
    sigma = np.nan_to_num(field.error.sigma_of(component, (ny, nx))).ravel()
    return np.kron(*rho) * np.outer(sigma, sigma)


def whole_map(field: Field) -> np.ndarray:
    """All that was done to the measured values, as one dense matrix."""
    matrix = np.eye(field.status.size)
    for change in field.maps:
        step = np.column_stack([change.forward(column) for column in np.eye(matrix.shape[0])])
        matrix = step @ matrix
    return matrix


def cleaned(kind: str, *, even=True, correlation=(1, 1), sigma=0.02, **attributes) -> Field:
    rng = np.random.default_rng(8)
    grid = lattice(*SHAPE, even=even)
    missing = rng.random(grid.shape) < 0.12
    centre = complex(grid.x.mean(), grid.y.mean())
    error = stated(sigma, correlation=correlation)
    field = vortex(grid, core=1.0, centre=centre, missing=missing, error=error, **attributes)
    field = field.with_(u=field.u + 1.7, v=field.v - 0.9)
    for step in kind.split(" + "):
        if step in ("linear", "harmonic", "biharmonic"):
            change = fill_map(field.grid, field.valid, ~field.valid, method=step)
            field = field.mapped(change, np.where(change.filled, Status.FILLED, field.status))
        elif step in ("gaussian", "savitzky_golay", "penalised"):
            width = {"gaussian": 0.8, "savitzky_golay": 5, "penalised": 6.0}[step]
            field = field.mapped(
                smoothing_map(field.grid, field.valid, method=step, width=width), field.status
            )
        elif step == "mean":
            field = remove_mean(field)
    return field


KINDS = (
    "measured",
    "biharmonic",
    "linear + gaussian",
    "mean",
    "harmonic + mean + savitzky_golay",
    "penalised",
    "mean + linear + penalised + mean",
    "gaussian + penalised",
)
NOISE_AT_NODES = np.random.default_rng(0).uniform(0.01, 0.03, SHAPE)


@pytest.mark.parametrize("scheme", SCHEMES)
@pytest.mark.parametrize("kind", KINDS)
def test_linear_quantities_are_exact_against_dense_matrices(kind, scheme):
    even = KINDS.index(kind) % 2 == 0
    correlation = ((1, 1), (2, 2), (2.5, 1.4))[KINDS.index(kind) % 3]
    sigma = {"u": NOISE_AT_NODES, "v": 0.015} if kind in ("biharmonic", "mean") else 0.02
    field = cleaned(kind, even=even, correlation=correlation, sigma=sigma, derivative=scheme)
    d_dx, d_dy = (rows.toarray() for rows in derivative_rows(field.grid, field.valid, scheme=scheme))
    passage = whole_map(field)
    for name, (of_u, of_v) in {
        "u": (np.eye(field.status.size), None),
        "vorticity": (-d_dy, d_dx),
        "divergence": (d_dx, d_dy),
        "shear_strain_rate": (0.5 * d_dy, 0.5 * d_dx),
    }.items():
        variance = 0.0
        for component, rows in (("u", of_u), ("v", of_v)):
            if rows is not None:
                carried = rows @ passage
                variance += ((carried @ measured_covariance(field, component)) * carried).sum(axis=1)
        found = quantity_map(field, name)
        there = np.isfinite(found.values)
        expected = np.sqrt(np.reshape(variance, SHAPE))
        np.testing.assert_allclose(found.uncertainty[there], expected[there], rtol=1e-6, err_msg=name)
        assert np.isnan(found.uncertainty[~there]).all()


def test_turned_axes_with_unequal_sigma():
    """Errors stay independent along the axes of the file: exact against the turned covariance matrix."""
    field = cleaned("measured", sigma={"u": 0.01, "v": NOISE_AT_NODES}, correlation=(2, 1))
    covariance = [measured_covariance(field, component) for component in "uv"]
    turned = turn_axes(field, angle=0.7, reflect="x")
    # reflected: u' = -(cos u + sin v), v' = -sin u + cos v
    cosine, sine = np.cos(0.7), np.sin(0.7)
    expected = np.sqrt(np.diag(cosine**2 * covariance[0] + sine**2 * covariance[1])).reshape(SHAPE)
    found = quantity_map(turned, "u")
    np.testing.assert_allclose(found.uncertainty[field.valid], expected[field.valid], rtol=1e-12)
    for name in ("vorticity", "divergence", "speed", "q_criterion"):
        before, after = quantity_map(field, name).uncertainty, quantity_map(turned, name).uncertainty
        np.testing.assert_allclose(after, before, rtol=1e-9, equal_nan=True, err_msg=name)


@pytest.mark.parametrize("kind", ["measured", "biharmonic", "linear + gaussian"])
def test_all_quantities_against_monte_carlo(kind):
    """300 draws so small that the first order is all there is; 4 % standard error of a node's spread."""
    field = cleaned(kind, correlation=(2, 2), sigma={"u": 0.02, "v": 0.03})
    rng, count = np.random.default_rng(6), 300
    passage, small = whole_map(field), 1e-4
    draws = {}
    for component, sigma in (("u", 0.02), ("v", 0.03)):
        noise = sigma * small * correlated_noise(rng, SHAPE, (2, 2), count).reshape(count, -1)
        draws[component] = (noise @ passage.T).reshape(count, *SHAPE)
    perturbed = [
        field.with_(u=field.u + u, v=field.v + v) for u, v in zip(draws["u"], draws["v"], strict=True)
    ]
    for name in QUANTITIES:
        if name == "w":
            continue
        found = quantity_map(field, name)
        changes = np.stack([quantity(one, name) for one in perturbed]) - found.values
        spread = np.sqrt((changes**2).mean(axis=0)) / small
        known = np.isfinite(found.uncertainty)
        ratio = spread[known] / found.uncertainty[known]
        assert known.sum() > (10 if name == "swirling_strength" else 70), name
        assert np.median(ratio) == pytest.approx(1, abs=0.025), name
        assert ratio.min() > 0.8 and ratio.max() < 1.2, name


def test_through_plane_velocity_keeps_its_mean_and_its_own_error():
    grid = lattice(*SHAPE)
    parts = {name: np.random.default_rng(1).normal(size=SHAPE) for name in "uvw"}
    field = remove_mean(Field(grid, **parts, error=stated(dict.fromkeys("uvw", 0.1))))
    assert isinstance(field.maps[-1], MeanRemoval)
    np.testing.assert_allclose(field.w, parts["w"])
    np.testing.assert_allclose(quantity_map(field, "w").uncertainty, 0.1)
    # a value and the mean it is part of: sigma sqrt(1 - 1/N)
    np.testing.assert_allclose(quantity_map(field, "u").uncertainty, 0.1 * np.sqrt(1 - 1 / 90))


def test_what_is_not_known_is_said():
    field = cleaned("measured")
    unknown = quantity_map(field.with_(error=ErrorModel()), "vorticity")
    assert unknown.uncertainty is None and unknown.reason.startswith("no uncertainty of ")
    alone = quantity_map(field.with_(error=ErrorModel(sigma={"u": 0.1})), "divergence")
    assert alone.uncertainty is None and alone.reason == "no uncertainty of v is stated"
    bound = quantity_map(field.with_(error=ErrorModel(sigma={"u": 0.1, "v": 0.1})), "divergence")
    assert "lower bound" in bound.reason and bound.uncertainty is not None
    assert quantity_map(field, "divergence").reason == ""


def test_local_slope_of_a_median_fill_is_labelled():
    field = cleaned("measured")
    change = fill_map(field.grid, field.valid, ~field.valid, method="local_median", values=field.components)
    filled = field.mapped(change, np.where(change.filled, Status.FILLED, field.status))
    assert "not linear" in quantity_map(filled, "u").reason


def test_no_swirl_has_no_first_order_uncertainty():
    field = cleaned("measured")
    found = quantity_map(field, "swirling_strength")
    still = found.values == 0
    assert still.any() and np.isnan(found.uncertainty[still]).all()


def test_a_wide_smoothing_of_many_nodes_is_refused_with_its_reason():
    grid = lattice(70, 70)
    field = vortex(grid, core=2.0, centre=10 + 10j, error=stated(0.1))
    field = field.mapped(smoothing_map(grid, field.valid, method="penalised", width=8.0), field.status)
    found = quantity_map(field, "vorticity")
    assert found.uncertainty is None and "4,900 nodes" in found.reason
