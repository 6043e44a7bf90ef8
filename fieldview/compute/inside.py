"""Means and extremes of the velocity and the vorticity within a closed contour."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from fieldview.compute.budget import made, random_part, systematic_parts
from fieldview.compute.contour import Contour
from fieldview.compute.derivatives import derivative_rows
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.numbers import Number
from fieldview.compute.pair_variance import block_variance, pair_variance, through_variance
from fieldview.compute.within import Within, within


def values_inside(contour: Contour, vorticity_integral: Number | None) -> dict[str, dict[str, Number]]:
    """Mean, least and greatest of u, v, speed, vorticity and w: quantity to "mean", "min", "max" to Number.

    Means are over the area, of the bilinear interpolant of the node values. Extremes are those of the nodes
    within or on the contour, with the uncertainty of that node; where there is no node they have no value.
    Only for a contour whose area is wholly measured; ``vorticity_integral`` is the one of the same contour.
    """
    nodes, field = within(contour), contour.prepared.field
    found = {}
    if field.in_plane:
        found |= _plane(contour, nodes)
        if vorticity_integral is not None and vorticity_integral.value is not None:
            found["vorticity"] = _vorticity(contour, vorticity_integral, nodes)
    if field.w is not None:
        found["w"] = _through(contour, nodes)
    return found


def _plane(contour: Contour, nodes: Within) -> dict[str, dict[str, Number]]:
    prepared, area = contour.prepared, contour.shape.area
    field, unit = prepared.field, prepared.field.units.velocity
    mean = prepared.velocity_sums.integral(contour.area_pieces) / area
    block, corner = contour.area
    spread = block_variance(block, corner, field)
    found = {}
    for name, value, across, part in (
        ("u", mean.real, mean.imag, None if spread is None else spread.first / area**2),
        ("v", mean.imag, mean.real, None if spread is None else spread.second / area**2),
    ):
        number = made(
            float(value),
            unit,
            random_part(part),
            systematic_parts(field, float(value), scale=1, tilt=float(abs(across)), offset=1.0),
        )
        found[name] = {"mean": number, **_extremes(nodes, unit, contour, name)}
    found["speed"] = {
        "mean": _mean_speed(contour),
        **_extremes(nodes, unit, contour, "speed"),
    }
    return found


def _mean_speed(contour: Contour) -> Number:
    """To first order a change of the speed is that of the component along the vector."""
    prepared, area = contour.prepared, contour.shape.area
    field = prepared.field
    mean = float(prepared.speed_sums.integral(contour.area_pieces)) / area
    block, corner = contour.area
    # half the digits are plenty for an uncertainty, and the block is what takes the time here
    single = block.astype(np.float32)
    spread = block_variance(single, corner, field, times=contour.block(prepared.direction_single))
    common = abs(prepared.direction_sums.integral(contour.area_pieces)) / area
    return made(
        mean,
        field.units.velocity,
        random_part(None if spread is None else spread.first / area**2),
        systematic_parts(field, mean, scale=1, offset=float(common)),
    )


def _vorticity(contour: Contour, integral: Number, nodes: Within) -> dict[str, Number]:
    """The mean is the integral over the area; a scale error touches that twice, and the mean not at all."""
    prepared, area = contour.prepared, contour.shape.area
    field, unit = prepared.field, prepared.field.units.of(0, -1)
    mean = integral.value / area
    random_and_gaps = [
        replace(part, uncertainty=None if part.uncertainty is None else part.uncertainty / area)
        for part in integral.budget
        if part.kind != "systematic"
    ]
    number = made(mean, unit, random_and_gaps, systematic_parts(field, mean, scale=0))
    return {"mean": number, **_extremes(nodes, unit, contour, "vorticity")}


def _through(contour: Contour, nodes: Within) -> dict[str, Number]:
    prepared, area = contour.prepared, contour.shape.area
    field, unit = prepared.field, prepared.field.units.velocity
    mean = float(prepared.through_sums.integral(contour.area_pieces)) / area
    block, corner = contour.area
    share = NodeWeights.of_block(block / area, corner, contour.grid.shape[1])
    number = made(
        mean,
        unit,
        random_part(through_variance(share, field)),
        systematic_parts(field, mean, scale=1, offset=1.0),
    )
    return {"mean": number, **_extremes(nodes, unit, contour, "w")}


def _extremes(nodes: Within, unit: str, contour: Contour, name: str) -> dict[str, Number]:
    """Least and greatest of a quantity at these nodes, each with the budget of its node."""
    values = contour.prepared.extremes(name)
    at = nodes.extremes(values)
    if at is None:
        return {"min": Number(None, unit), "max": Number(None, unit)}
    found = [float(values.values[node]) for node in at]
    budgets = zip(_random_at(contour, name, at), found, at, strict=True)
    return {
        word: made(value, unit, random_part(random), _systematic_at(contour, name, value, node))
        for word, (random, value, node) in zip(("min", "max"), budgets, strict=True)
    }


def _random_at(contour: Contour, name: str, nodes: list[int]) -> list[float | None]:
    """Variance of a quantity at some nodes."""
    prepared = contour.prepared
    field = prepared.field
    if name == "w":
        return [through_variance(NodeWeights(np.array([node]), np.ones(1)), field) for node in nodes]
    if name == "vorticity":
        weights = _vorticity_at(nodes, contour)
    else:
        fixed = {"u": 1 + 0j, "v": 1j}
        directions = [fixed.get(name, complex(prepared.direction[node]) or 1 + 0j) for node in nodes]
        weights = [NodeWeights(np.array([n]), np.array([d])) for n, d in zip(nodes, directions, strict=True)]
    spreads = [pair_variance(part, field) for part in weights]
    return [None if spread is None else spread.first for spread in spreads]


def _systematic_at(contour: Contour, name: str, value: float, node: int):
    prepared = contour.prepared
    if name == "vorticity":
        return systematic_parts(prepared.field, value, scale=0)
    tilt = 0.0
    if name in ("u", "v"):
        velocity = complex(prepared.velocity[node])
        tilt = abs(velocity.imag if name == "u" else velocity.real)
    return systematic_parts(prepared.field, value, scale=1, tilt=tilt, offset=1.0)


def _vorticity_at(nodes: list[int], contour: Contour) -> list[NodeWeights]:
    """Complex weights of (vorticity, divergence) at some nodes: see `rate_weights`."""
    prepared = contour.prepared
    place, scheme = prepared.grid.placement, prepared.field.derivative
    order = np.unique(nodes)
    d_dx, d_dy = derivative_rows(prepared.grid, prepared.valid, scheme=scheme, nodes=order)
    along_y = (1 if place.mirrored else -1) * place.factor
    found = []
    for row in np.searchsorted(order, nodes):
        of_x, of_y = (slice(*part.indptr[row : row + 2]) for part in (d_dx, d_dy))
        values = [1j * place.factor * d_dx.data[of_x], along_y * d_dy.data[of_y]]
        at = np.concatenate([d_dx.indices[of_x], d_dy.indices[of_y]])
        found.append(NodeWeights.gathered(at, np.concatenate(values)))
    return found
