"""Uncertainty maps: how the random errors of the vectors reach a quantity at every node.

A quantity's change is its slopes times the changes of three functionals of each component at the node: the
value itself and the two derivatives along the lattice. Their covariances are made once per field
and scheme, exactly, from the error model: in closed form where the plain stencil stands on
measured vectors, through the rows of the operators where it meets an edge, a gap, a filled or a smoothed
vector. Every quantity of the field then takes what it needs of them.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from weakref import WeakKeyDictionary

import numpy as np
import scipy.sparse as sp

from fieldview.compute.derivatives import derivative_rows
from fieldview.compute.field import Field
from fieldview.compute.linear import MeanRemoval
from fieldview.compute.local import DERIVATIVES, Local
from fieldview.compute.passage import Passage, changed_nodes
from fieldview.compute.penalised import PenalisedMap
from fieldview.compute.stencil_covariance import closed_sum, stencil

_MOST_DENSE_NODES = 4096
"""Nodes up to which a smoothing that reaches over the whole grid is followed node by node."""

_CHUNK = 50_000
"""Rows of the operators worked on at a time."""

LOWER_BOUND = "no correlation length is stated; with independent errors assumed it is a lower bound"

_kept: WeakKeyDictionary[Field, dict[str, NodeCovariance]] = WeakKeyDictionary()


def map_uncertainty(
    local: Local, slopes: Callable[[], dict], wanted: np.ndarray
) -> tuple[np.ndarray | None, str]:
    """Standard uncertainty (ny, nx) of a quantity with these slopes, NaN outside ``wanted``; and remarks.

    None where it is not known; the remark then says why.
    """
    field = local.field
    coefficients = _coefficients(slopes(), local.axes)
    reason = _unknown(field, coefficients)
    if reason:
        return None, reason
    covariance = _covariance_of(field, local.scheme)
    variance = np.zeros(field.grid.shape)
    for component, factors in _independent(coefficients, field.error.turn).items():
        names = list(factors)
        for i, first in enumerate(names):
            for second in names[i:]:
                twice = 1.0 if first == second else 2.0
                variance += twice * factors[first] * factors[second] * covariance(component, first, second)
    uncertainty = np.where(wanted, np.sqrt(np.maximum(variance, 0.0)), np.nan)
    return uncertainty, "; ".join(_remarks(field))


def _unknown(field: Field, components: Iterable[str]) -> str:
    turned = ["u", "v"] if field.error.turn != 1 else []
    for name in {*components, *turned}:
        if field.error.sigma_of(name, field.grid.shape) is None:
            return f"no uncertainty of {name} is stated"
    for change in field.maps:
        if isinstance(change, PenalisedMap) and field.status.size > _MOST_DENSE_NODES:
            return (
                f"the smoothing reaches over all {field.status.size:,} nodes; "
                f"its uncertainty is followed on up to {_MOST_DENSE_NODES:,}"
            )
    return ""


def _remarks(field: Field) -> list[str]:
    remarks = list(dict.fromkeys(change.note for change in field.maps if change.note))
    return remarks if field.error.correlation_stated else [*remarks, LOWER_BOUND]


def _coefficients(slopes: dict, axes: np.ndarray) -> dict[str, dict[str, np.ndarray | float]]:
    """For each component the factors of "value", "x" and "y": the node's value and lattice derivatives."""
    found: dict[str, dict] = {}
    for name, slope in slopes.items():
        component, axis = DERIVATIVES.get(name, (name, None))
        shares = {"value": 1.0} if axis is None else dict(zip(("x", "y"), axes[axis], strict=True))
        factors = found.setdefault(component, {})
        for functional, share in shares.items():
            if share != 0:
                factors[functional] = factors.get(functional, 0.0) + share * slope
    return found


def _independent(coefficients: dict, turn: complex) -> dict[str, dict]:
    """The coefficients of the components whose errors are independent: (a + ib) times the turn."""
    if turn == 1:
        return coefficients
    u, v = coefficients.get("u", {}), coefficients.get("v", {})
    turned: dict[str, dict] = {name: part for name, part in coefficients.items() if name == "w"}
    for name, (of_u, of_v) in {"u": (turn.real, -turn.imag), "v": (turn.imag, turn.real)}.items():
        turned[name] = {key: of_u * u.get(key, 0.0) + of_v * v.get(key, 0.0) for key in {*u, *v}}
    return turned


def _covariance_of(field: Field, scheme: str) -> NodeCovariance:
    by_scheme = _kept.setdefault(field, {})
    if scheme not in by_scheme:
        by_scheme[scheme] = NodeCovariance(field, scheme)
    return by_scheme[scheme]


class NodeCovariance:
    """Covariances between value and derivatives of one component's errors, node by node.

    Called with a component and two of "value", "x", "y" it gives a map (ny, nx), or one number where they
    are all the same; of no meaning at nodes without the functional. Results are kept.
    """

    def __init__(self, field: Field, scheme: str):
        # the field itself is the key this is kept under: holding it would keep both for ever
        self.grid, self.valid, self.maps, self.error = field.grid, field.valid, field.maps, field.error
        self.scheme = scheme
        self._found: dict[tuple, np.ndarray] = {}

    def __call__(self, component: str, first: str, second: str) -> np.ndarray | float:
        sigma = self.error.sigma[component]
        # one sigma for all nodes: the map for sigma 1 serves every component
        common, shape = (None, float(sigma) ** 2) if np.ndim(sigma) == 0 else (component, 1.0)
        branch = "w" if component == "w" else "plane"
        key = (common, branch, *sorted((first, second)))
        if key not in self._found:
            weight = 1.0 if common is None else np.nan_to_num(np.asarray(sigma, float))
            self._found[key] = self._map(np.broadcast_to(weight, self.grid.shape), branch, key[2], key[3])
        return shape * self._found[key]

    def _map(self, sigma: np.ndarray, branch: str, first: str, second: str) -> np.ndarray:
        maps = [m for m in self.maps if branch == "plane" or not isinstance(m, MeanRemoval)]
        plain = self.valid & ~changed_nodes(maps, self.grid.shape)
        stencils = [stencil(self.grid, name, self.scheme) for name in (first, second)]
        closed = np.logical_and.reduce([own.stands_on(plain) for own in stencils])
        result = np.zeros(self.grid.shape)
        passage = Passage(maps, sigma, self.error.correlation)
        if closed.any():
            plain_sum = closed_sum(*stencils, sigma, self.error.correlation)
            if {first, second} == {"value"}:
                plain_sum = plain_sum + passage.correction_of_plain_values()
            np.copyto(result, plain_sum, where=closed)
        rest = np.flatnonzero(self.valid & ~closed)
        for start in range(0, rest.size, _CHUNK):
            nodes = rest[start : start + _CHUNK]
            result.ravel()[nodes] = self._through_rows(nodes, passage, first, second)
        return result

    def _through_rows(self, nodes, passage: Passage, first: str, second: str) -> np.ndarray:
        ones = (np.ones(nodes.size), (np.arange(nodes.size), nodes))
        rows = {"value": sp.csr_array(ones, shape=(nodes.size, self.valid.size))}
        if {first, second} != {"value"}:
            d_dx, d_dy = derivative_rows(self.grid, self.valid, scheme=self.scheme, nodes=nodes)
            rows |= {"x": d_dx, "y": d_dy}
        if first == second:
            return passage.variances(rows[first])
        # the covariance of two functionals from the variances of their sum and difference
        total, difference = rows[first] + rows[second], rows[first] - rows[second]
        return 0.25 * (passage.variances(total) - passage.variances(difference))
