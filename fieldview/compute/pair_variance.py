"""Random uncertainty of linear functionals of a field, exact under its error model.

Errors of u and v are independent of each other; for the pair sum w conj(U), w = a + ib:
var first = a'C_u a + b'C_v b, var second = b'C_u b + a'C_v a, cov = a'C_u b - b'C_v a
(JCGM 100:2008, 5.2; JCGM 102:2011 for the pair).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from fieldview.compute.covariance import triangle
from fieldview.compute.field import Field
from fieldview.compute.node_weights import NodeWeights, carried_back

_CACHED_NODES = 32_768
"""Nodes worked on at a time."""

_DENSE = 0.15
"""Share of the nodes of their bounding box from which weights are treated as a block."""


@dataclass(frozen=True)
class PairVariance:
    """Variances of the two numbers of a pair and their covariance. [value^2]"""

    first: float
    second: float
    covariance: float

    @property
    def spread(self) -> complex:
        """Both standard uncertainties, as real and imaginary part."""
        return complex(self.first**0.5, self.second**0.5)


def pair_variance(weights: NodeWeights, field: Field, *, measured: bool = False) -> PairVariance | None:
    """Of a pair of functionals of u and v, through filling and smoothing; None where sigma is not known.

    Parameters
    ----------
    weights : NodeWeights
        Complex, in the plane's axes.
    field : Field
    measured : bool
        Whether they are weights on the measured vectors and not on the field's cleaned ones.
    """
    error, shape = field.error, field.grid.shape
    if error.sigma is None or not {"u", "v"} <= set(error.sigma):
        return None
    if not measured:
        weights = carried_back(weights, field.maps, field.status.size)
    turned = weights.values * error.turn
    sigmas = [error.sigma["u"], error.sigma["v"]]
    if all(np.ndim(sigma) == 0 for sigma in sigmas):
        common = np.array(_forms(weights.nodes, turned, shape, error.correlation))
        of_u, of_v = (float(sigma) ** 2 * common for sigma in sigmas)
    else:
        of_u, of_v = (
            _forms(weights.nodes, turned * _at(sigma, weights.nodes), shape, error.correlation)
            for sigma in sigmas
        )
    (aa_u, bb_u, ab_u), (aa_v, bb_v, ab_v) = of_u, of_v
    found = PairVariance(max(aa_u + bb_v, 0.0), max(bb_u + aa_v, 0.0), ab_u - ab_v)
    return found if np.isfinite(found.first + found.second) else None


def block_variance(
    block: np.ndarray, corner: tuple[int, int], field: Field, *, times: np.ndarray | None = None
) -> PairVariance | None:
    """As `pair_variance`, of weights (rows, columns) on a block of nodes whose first one is ``corner``."""
    error = field.error
    scalar = error.sigma is not None and all(np.ndim(error.sigma.get(name, 0)) == 0 for name in ("u", "v"))
    if not scalar or field.maps or not {"u", "v"} <= set(error.sigma):
        whole = block * (1 + 0j if times is None else times)
        return pair_variance(NodeWeights.of_block(whole, corner, field.grid.shape[1]), field)
    if error.turn != 1:
        times = error.turn if times is None else times * error.turn
    aa, bb, ab = _block_forms(block, error.correlation, times)
    var_u, var_v = (float(error.sigma[name]) ** 2 for name in ("u", "v"))
    return PairVariance(var_u * aa + var_v * bb, var_u * bb + var_v * aa, (var_u - var_v) * ab)


def through_variance(weights: NodeWeights, field: Field, *, measured: bool = False) -> float | None:
    """Of a functional of w, with real weights; None where its sigma is not known."""
    error = field.error
    if error.sigma is None or "w" not in error.sigma:
        return None
    if not measured:
        weights = carried_back(weights, field.maps, field.status.size, plane=False)
    weighted = weights.values * _at(error.sigma["w"], weights.nodes)
    found, _, _ = _forms(weights.nodes, weighted, field.grid.shape, error.correlation)
    return max(float(found), 0.0) if np.isfinite(found) else None


def _at(sigma, nodes: np.ndarray):
    return float(sigma) if np.ndim(sigma) == 0 else np.asarray(sigma, float).ravel()[nodes]


def _forms(nodes, z, shape, correlation) -> tuple[float, float, float]:
    """a'Ra, b'Rb and a'Rb of z = a + ib on these nodes (increasing), R the correlation coefficients."""
    if nodes.size == 0:
        return 0.0, 0.0, 0.0
    if max(correlation) <= 1:
        a, b = z.real, z.imag
        return float(a @ a), float(b @ b), float(a @ b)
    rows, columns = np.divmod(nodes, shape[1])
    top, left = int(rows[0]), int(columns.min())
    box = (int(rows[-1]) - top + 1, int(columns.max()) - left + 1)
    if nodes.size > _DENSE * box[0] * box[1]:
        block = np.zeros(box, z.dtype)
        block[rows - top, columns - left] = z
        return _block_forms(block, correlation)
    half = _half_image(rows, columns, z, shape[1], correlation)
    return _parts((z.conj() * (z + 2 * half)).sum().real, (z * (z + 2 * half)).sum())


def _parts(modulus: float, square: complex) -> tuple[float, float, float]:
    """a'Ra, b'Rb and a'Rb from conj(z)'Rz and z'Rz."""
    return 0.5 * (modulus + square.real), 0.5 * (modulus - square.real), 0.5 * float(np.imag(square))


def _block_forms(
    block: np.ndarray, correlation: tuple[float, float], times=None
) -> tuple[float, float, float]:
    """a'Ra, b'Rb and a'Rb of weights a + ib on a block of nodes; ``times`` is a factor or one per node."""
    if not all(float(nodes).is_integer() for nodes in correlation):
        block = block if times is None else block * times
        image = _correlated_block(block, correlation)
        return _parts(np.vdot(block, image).real, np.dot(block.ravel(), image.ravel()))
    # the triangle is a box folded with itself: R = B'B / (mx my)
    modulus = square = 0.0
    for boxed in _boxed(block, int(correlation[0]), int(correlation[1]), times):
        own = float(np.vdot(boxed, boxed).real)
        modulus += own
        square += np.dot(boxed.ravel(), boxed.ravel()) if np.iscomplexobj(boxed) else own
    return _parts(modulus / np.prod(correlation), square / np.prod(correlation))


def _boxed(block: np.ndarray, along_x: int, along_y: int, times) -> Iterator[np.ndarray]:
    """Sums of the block, zero around it, over boxes of nodes: some rows at a time, to stay in the cache."""
    rows = block.shape[0]
    step = max(_CACHED_NODES // block.shape[1], 1)
    for start in range(0, rows + along_y - 1, step):
        first, last = max(start - along_y + 1, 0), min(start + step, rows)
        part = block[first:last]
        if times is not None:
            part = part * (times[first:last] if np.ndim(times) else times)
        sums = _box_sum(part, along_y, 0)
        yield _box_sum(sums[start - first : start - first + step], along_x, 1)


def _box_sum(block: np.ndarray, nodes: int, axis: int) -> np.ndarray:
    """Sums over this many neighbouring nodes along an axis, those that reach beyond the block too."""
    if nodes == 1:
        return block
    count = block.shape[axis]
    shape = list(block.shape)
    shape[axis] += nodes - 1
    total = np.empty(shape, block.dtype)

    def lines(of: np.ndarray, first: int, last: int | None) -> np.ndarray:
        return of[first:last] if axis == 0 else of[:, first:last]

    # the first two of the sum in one pass
    lines(total, 0, 1)[:] = lines(block, 0, 1)
    np.add(lines(block, 1, None), lines(block, 0, count - 1), out=lines(total, 1, count))
    lines(total, count, count + 1)[:] = lines(block, count - 1, None)
    lines(total, count + 1, None)[:] = 0
    for shift in range(2, nodes):
        moved = lines(total, shift, shift + count)
        moved += block
    return total


def _correlated_block(block: np.ndarray, correlation: tuple[float, float]) -> np.ndarray:
    for axis, nodes in ((0, correlation[1]), (1, correlation[0])):
        rho = triangle(nodes)
        reach = rho.size // 2
        total = block.copy()
        lines = np.moveaxis(block, axis, 0), np.moveaxis(total, axis, 0)
        for lag in range(1, min(reach, block.shape[axis] - 1) + 1):
            lines[1][lag:] += rho[reach + lag] * lines[0][:-lag]
            lines[1][:-lag] += rho[reach + lag] * lines[0][lag:]
        block = total
    return block


def _half_image(rows, columns, z, nx, correlation) -> np.ndarray:
    """For each node the sum over all nodes behind it of correlation coefficient times z."""
    along_x, along_y = triangle(correlation[0]), triangle(correlation[1])
    reach_x, reach_y = along_x.size // 2, along_y.size // 2
    count = z.size
    stride = nx + 2 * reach_x + 1  # so that the end of a row is far from the start of the next
    keys = np.append(rows * stride + columns, np.full(2 * reach_x + 1, np.iinfo(np.int64).max // 2))
    padded = np.append(z, np.zeros(2 * reach_x + 1, z.dtype))
    rho = np.append(along_x, 0.0)
    image = np.zeros(count, z.dtype)
    for lag in range(1, reach_x + 1):
        distance = np.minimum(keys[lag : count + lag] - keys[:count], reach_x + 1)
        image += rho[reach_x + distance] * padded[lag : count + lag]
    for lag in range(1, reach_y + 1):
        start = keys[:count] + lag * stride - reach_x
        first = np.searchsorted(keys, start)
        for step in range(2 * reach_x + 1):
            column = np.minimum(keys[first + step] - start, 2 * reach_x + 1)
            image += (along_y[reach_y + lag] * rho[column]) * padded[first + step]
    return image
