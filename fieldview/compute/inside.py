"""Means and extremes of the velocity and the vorticity within a closed contour."""

from __future__ import annotations

import numpy as np

from fieldview.compute.budget import made, random_part, systematic_parts
from fieldview.compute.contour import Contour
from fieldview.compute.derivatives import derivative_rows
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.numbers import Number
from fieldview.compute.pair_variance import pair_variance, through_variance

_ON_LINE = 1e-9
"""Share of a cell within which the end of a piece counts as on a grid line."""


def values_inside(contour: Contour) -> dict[str, dict[str, Number]]:
    """Mean, least and greatest of u, v, speed, vorticity and w: quantity to "mean", "min", "max" to Number.

    Means are over the area, of the bilinear interpolant of the node values. Extremes are those of the nodes
    within or on the contour, with the uncertainty of that node; where there is no node they have no value.
    Only for a contour whose area is wholly measured.
    """
    weights, corner = contour.area
    area = weights.sum()
    share = NodeWeights.of_block(weights / area, corner, contour.grid.shape[1])
    nodes = nodes_within(contour)
    found = {}
    if contour.prepared.field.in_plane:
        found |= _plane(contour, share, nodes)
        if contour.rate_share == 1:
            found["vorticity"] = _vorticity(contour, area, nodes)
    if contour.prepared.field.w is not None:
        found["w"] = _through(contour, share, nodes)
    return found


def nodes_within(contour: Contour) -> np.ndarray:
    """Flat nodes within or on a closed contour that lies in the grid: int (k,), increasing."""
    ny, nx = contour.grid.shape
    pieces = contour.pieces
    top, left = int(pieces.iy.min()), int(pieces.ix.min())
    rows, columns = int(pieces.iy.max()) - top + 2, int(pieces.ix.max()) - left + 2
    ends = [(pieces.a + side * pieces.da, pieces.b + side * pieces.db) for side in (-0.5, 0.5)]
    on_row = [np.abs(b - np.round(b)) < _ON_LINE for _, b in ends]
    along = on_row[0] & on_row[1] & (np.abs(pieces.db) < 0.5)  # neither of its ends crosses the row
    turns = np.zeros(rows * (columns + 1))
    on_contour = np.zeros((rows, columns), bool)
    for (a, b), on in zip(ends, on_row, strict=True):
        # half a turn, for all nodes to the right, at either end of a piece that comes to a grid row
        at = np.flatnonzero(on & ~along)
        row = pieces.iy[at] - top + np.round(b[at]).astype(int)
        column = pieces.ix[at] - left + (a[at] > _ON_LINE)
        turns += np.bincount(row * (columns + 1) + column, 0.5 * np.sign(pieces.db[at]), turns.size)
        at = np.flatnonzero(on & (np.abs(a - np.round(a)) < _ON_LINE))
        row, column = (np.round(part[at]).astype(int) for part in (b, a))
        on_contour[pieces.iy[at] - top + row, pieces.ix[at] - left + column] = True
    turned = np.cumsum(turns.reshape(rows, columns + 1), axis=1)[:, :columns]
    iy, ix = np.nonzero((np.abs(turned) > 0.25) | on_contour)
    kept = (iy + top < ny) & (ix + left < nx)
    return ((iy + top) * nx + ix + left)[kept]


def _plane(contour: Contour, share: NodeWeights, nodes: np.ndarray) -> dict[str, dict[str, Number]]:
    prepared = contour.prepared
    field, velocity = prepared.field, prepared.velocity
    unit = field.units.velocity
    means = prepared.of_pair(share).conjugate()
    spread = pair_variance(share.times(1 + 0j), field)
    u_part, v_part = (None, None) if spread is None else (spread.first, spread.second)
    speed = np.abs(velocity)
    found = {}
    for name, mean, part, across in (
        ("u", means.real, u_part, means.imag),
        ("v", means.imag, v_part, means.real),
    ):
        values = getattr(velocity, "real" if name == "u" else "imag")
        number = made(
            mean,
            unit,
            random_part(part),
            systematic_parts(field, mean, scale=1, tilt=abs(across), offset=1.0),
        )
        found[name] = {"mean": number, **_extremes(values, nodes, unit, _budget_of(contour, name))}
    found["speed"] = {
        "mean": _mean_speed(contour, share, speed),
        **_extremes(speed, nodes, unit, _budget_of(contour, "speed")),
    }
    return found


def _mean_speed(contour: Contour, share: NodeWeights, speed: np.ndarray) -> Number:
    """To first order a change of the speed is that of the component along the vector."""
    prepared = contour.prepared
    field = prepared.field
    size = speed[share.nodes]
    along = prepared.velocity[share.nodes] / np.where(size > 0, size, 1.0)
    mean = share.of(speed)
    weights = NodeWeights(share.nodes, share.values * along)
    spread = pair_variance(weights, field)
    return made(
        mean,
        field.units.velocity,
        random_part(None if spread is None else spread.first),
        systematic_parts(field, mean, scale=1, offset=float(abs((share.values * along).sum()))),
    )


def _vorticity(contour: Contour, area: float, nodes: np.ndarray) -> dict[str, Number]:
    prepared = contour.prepared
    field = prepared.field
    unit = field.units.of(0, -1)
    mean = complex(prepared.rate_sums.integral(contour.rate_pieces)).real / area
    spread = pair_variance(contour.rates.times(1 / area), field)
    number = made(
        mean,
        unit,
        random_part(None if spread is None else spread.first),
        systematic_parts(field, mean, scale=0),
    )
    values = prepared.rates.real.ravel()
    return {"mean": number, **_extremes(values, nodes, unit, _budget_of(contour, "vorticity"))}


def _through(contour: Contour, share: NodeWeights, nodes: np.ndarray) -> dict[str, Number]:
    prepared = contour.prepared
    field, unit = prepared.field, prepared.field.units.velocity
    mean = share.of(prepared.through)
    number = made(
        mean,
        unit,
        random_part(through_variance(share, field)),
        systematic_parts(field, mean, scale=1, offset=1.0),
    )
    return {"mean": number, **_extremes(prepared.through, nodes, unit, _budget_of(contour, "w"))}


def _extremes(values: np.ndarray, nodes: np.ndarray, unit: str, parts) -> dict[str, Number]:
    """Least and greatest of the values at these nodes; ``parts`` gives the budget at a node."""
    if nodes.size == 0:
        return {"min": Number(None, unit), "max": Number(None, unit)}
    held = values[nodes]
    found = {}
    for name, at in (("min", int(held.argmin())), ("max", int(held.argmax()))):
        value = float(held[at])
        found[name] = made(value, unit, *parts(int(nodes[at]), value))
    return found


def _budget_of(contour: Contour, name: str):
    """The budget of a quantity at one node: a function of flat node and value."""
    prepared = contour.prepared
    field = prepared.field

    def parts(node: int, value: float):
        if name == "w":
            random = through_variance(NodeWeights(np.array([node]), np.ones(1)), field)
            return random_part(random), systematic_parts(field, value, scale=1, offset=1.0)
        if name == "vorticity":
            spread = pair_variance(_vorticity_at(node, contour), field)
            random = None if spread is None else spread.first
            return random_part(random), systematic_parts(field, value, scale=0)
        velocity = complex(prepared.velocity[node])
        direction = {"u": 1 + 0j, "v": 1j, "speed": velocity / abs(velocity) if velocity else 1 + 0j}[name]
        spread = pair_variance(NodeWeights(np.array([node]), np.array([direction])), field)
        random = None if spread is None else spread.first
        tilt = {"u": abs(velocity.imag), "v": abs(velocity.real), "speed": 0.0}[name]
        return random_part(random), systematic_parts(field, value, scale=1, tilt=tilt, offset=1.0)

    return parts


def _vorticity_at(node: int, contour: Contour) -> NodeWeights:
    """Complex weights of (vorticity, divergence) at a node: see `rate_weights`."""
    prepared = contour.prepared
    place, scheme = prepared.grid.placement, prepared.field.derivative
    d_dx, d_dy = derivative_rows(prepared.grid, prepared.valid, scheme=scheme, nodes=np.array([node]))
    along_y = (1 if place.mirrored else -1) * place.factor
    nodes = np.concatenate([d_dx.indices, d_dy.indices])
    return NodeWeights.gathered(nodes, np.concatenate([1j * place.factor * d_dx.data, along_y * d_dy.data]))
