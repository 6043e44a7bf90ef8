"""Derivative schemes against their published stencils, orders, noise gains and losses."""

import numpy as np
import pytest
import sympy

from fieldview.compute.derivatives import SCHEMES, derivative, derivative_rows, noise_gain
from fieldview.compute.grid import Grid
from tests.compute.flows import correlated_noise, vortex

# Stencils of the comparison in Raffel et al., Particle Image Velocimetry: A Practical Guide, chapter on the
# estimation of differential quantities, and their orders.
STENCILS = {
    "central": (sympy.Rational(1, 2) * sympy.Matrix([0, -1, 0, 1, 0]), 2),
    "richardson": (sympy.Rational(1, 12) * sympy.Matrix([1, -8, 0, 8, -1]), 4),
    "least_squares": (sympy.Rational(1, 10) * sympy.Matrix([-2, -1, 0, 1, 2]), 2),
}


def _row(scheme: str, axis: int) -> np.ndarray:
    grid = Grid(np.arange(9.0), np.arange(9.0))
    rows = derivative_rows(grid, np.ones((9, 9), bool), scheme=scheme, nodes=np.array([40]))
    return rows[axis].toarray().reshape(9, 9)


@pytest.mark.parametrize("scheme", STENCILS)
def test_published_stencil(scheme):
    expected = np.array(STENCILS[scheme][0].tolist(), float).ravel()
    np.testing.assert_allclose(_row(scheme, 0)[4, 2:7], expected, atol=1e-15)
    np.testing.assert_allclose(_row(scheme, 1)[2:7, 4], expected, atol=1e-15)
    assert np.count_nonzero(np.abs(_row(scheme, 0)) > 1e-15) == np.count_nonzero(expected)


@pytest.mark.parametrize("scheme", STENCILS)
def test_order_by_taylor_expansion(scheme):
    """The first term left over, by sympy from the published stencil, decides the rate of our error."""
    weights, order = STENCILS[scheme]
    h = sympy.Symbol("h")
    derivatives = sympy.symbols("f0:7")
    sampled = [
        sum(derivatives[n] * (k * h) ** n / sympy.factorial(n) for n in range(7)) for k in range(-2, 3)
    ]
    error = sympy.expand(sum(w * s for w, s in zip(weights, sampled, strict=True)) / h - derivatives[1])
    lowest = min(sympy.degree(term, h) for term in sympy.Add.make_args(error))
    assert lowest == order
    coefficient = error.coeff(h, order).subs(derivatives[order + 1], 1)
    step = 0.01
    grid = Grid(step * np.arange(-4, 5), step * np.arange(3))
    slope, _ = derivative(np.exp(grid.x)[None, :] + np.zeros((3, 1)), grid, "x", scheme=scheme)
    assert slope[1, 4] - 1 == pytest.approx(float(coefficient) * step**order, rel=2e-3)


def test_circulation_scheme_is_the_loop_around_eight_neighbours():
    """Trapezoidal circulation around eight neighbours over the area 4 spacing^2 (Raffel et al., ibid.)."""
    rng = np.random.default_rng(0)
    u, v = rng.normal(size=(2, 9, 9))
    loop = 0.5 * (u[3, 3] + 2 * u[3, 4] + u[3, 5]) - 0.5 * (u[5, 3] + 2 * u[5, 4] + u[5, 5])
    loop += 0.5 * (v[3, 5] + 2 * v[4, 5] + v[5, 5]) - 0.5 * (v[3, 3] + 2 * v[4, 3] + v[5, 3])
    ours = (_row("circulation", 0) * v).sum() - (_row("circulation", 1) * u).sum()
    assert ours == pytest.approx(loop / 4, abs=1e-14)


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("scheme", SCHEMES)
def test_order_of_convergence_on_even_and_uneven_axes(scheme, even):
    """Halving the spacing lowers the error by 2^order; a tenth of an order is left to the next term."""
    order = SCHEMES[scheme].order
    errors = []
    for refinement in (1, 2):
        steps = np.linspace(-1, 1, 40 * refinement + 1)
        axis = steps if even else steps + 0.2 * steps**2
        grid = Grid(axis, axis)
        x, y = np.meshgrid(grid.x, grid.y)
        slope, _ = derivative(np.sin(3 * x + 1) * np.cos(2 * y), grid, "x", scheme=scheme)
        middle = 26 * refinement
        exact = 3 * np.cos(3 * x + 1) * np.cos(2 * y)
        errors.append(abs(slope - exact)[middle, middle])
    assert np.log2(errors[0] / errors[1]) == pytest.approx(order, abs=0.1)


# methods.md, "verified": recomputed from the definitions of the stencils; the first row also in Raffel et al.
GAINS = {
    "central": (0.707, (1.00, 1.00, 0.71)),
    "richardson": (0.950, (1.34, 1.26, 0.83)),
    "least_squares": (0.316, (0.447, 0.529, 0.510)),
    "circulation": (None, (0.612, 0.791, 0.637)),
}


@pytest.mark.parametrize("scheme", GAINS)
def test_noise_gains(scheme):
    single, vorticity = GAINS[scheme]
    if single is not None:
        assert noise_gain(scheme, quantity="d_dx") == pytest.approx(single, abs=6e-4)
    for nodes, expected in zip((1, 2, 4), vorticity, strict=True):
        found = noise_gain(scheme, correlation=(nodes, nodes))
        assert found == pytest.approx(expected, abs=0.0051)


def test_noise_gain_of_central_differences_under_correlation():
    """sigma_omega^2 = (sigma/spacing)^2 [1 - rho(2 spacing)]: Sciacchitano & Wieneke (2016) MST 27:084006."""
    for nodes in (1.0, 2.5, 3.0, 4.0, 7.3):
        rho = max(0.0, 1 - 2 / nodes)
        assert noise_gain("central", correlation=(nodes, nodes)) == pytest.approx(np.sqrt(1 - rho))


@pytest.mark.parametrize("scheme", SCHEMES)
def test_noise_gain_is_what_simulated_noise_does(scheme):
    rng = np.random.default_rng(3)
    u, v = correlated_noise(rng, (300, 300), (2, 2), 2)
    grid = Grid(np.arange(300.0), np.arange(300.0))
    vorticity = derivative(v, grid, "x", scheme=scheme)[0] - derivative(u, grid, "y", scheme=scheme)[0]
    # 90,000 nodes, some 10^4 of them independent: 0.7 % standard error
    assert vorticity[5:-5, 5:-5].std() == pytest.approx(noise_gain(scheme, correlation=(2, 2)), rel=0.025)


# methods.md, "measured, verified": loss of the peak vorticity for a core of 2, 3, 5 cells [%]
LOSSES = {
    "central": (11.5, 5.4, 2.0),
    "richardson": (3.1, 0.7, 0.1),
    "least_squares": (32, 17, 6.5),
    "circulation": (16, 7.8, 2.9),
}


@pytest.mark.parametrize("scheme", LOSSES)
def test_loss_of_a_lamb_oseen_peak(scheme):
    grid = Grid(np.arange(-12.0, 13), np.arange(-12.0, 13))
    for core, expected in zip((2, 3, 5), LOSSES[scheme], strict=True):
        field = vortex(grid, core=core, centre=0j, peak=0.63817 / core)
        vorticity = derivative(field.v, grid, "x", scheme=scheme)[0]
        vorticity -= derivative(field.u, grid, "y", scheme=scheme)[0]
        loss = 100 * (1 - vorticity[12, 12] * core**2 / 2)
        assert loss == pytest.approx(expected, abs=0.06 if expected < 13 else 0.6)
