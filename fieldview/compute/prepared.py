"""What is made of a field once, so that every region on it is quick."""

from __future__ import annotations

from functools import cached_property

import numpy as np

from fieldview.compute.area_sums import MeasuredArea, RunningSums
from fieldview.compute.block_extremes import BlockExtremes
from fieldview.compute.field import Field, Status
from fieldview.compute.line_weights import KeysLine
from fieldview.compute.local import Local
from fieldview.compute.node_weights import NodeWeights
from fieldview.compute.stencil_covariance import Stencil, stencil


class Prepared:
    """Running sums and masks of one field; each is made when first asked for, and kept."""

    def __init__(self, field: Field):
        self.field = field
        self.grid = field.grid
        self._extremes: dict[str, BlockExtremes] = {}

    @cached_property
    def velocity(self) -> np.ndarray:
        """u + iv in the plane's axes at every node, 0 where not valid: complex (ny * nx,)."""
        parts = np.empty(self.grid.shape, complex)
        parts.real, parts.imag = self.field.u, self.field.v
        return self._without_nan(parts).ravel()

    @cached_property
    def through(self) -> np.ndarray:
        """w at every node, 0 where not valid: (ny * nx,)."""
        return self._without_nan(np.array(self.field.w)).ravel()

    def _without_nan(self, values: np.ndarray) -> np.ndarray:
        if not self.valid.all():
            values[~self.valid] = 0.0
        return values

    @cached_property
    def valid(self) -> np.ndarray:
        """Nodes with a vector, bool (ny, nx)."""
        return self.field.valid

    @cached_property
    def cells(self) -> np.ndarray:
        """Measured cells: those with vectors at all corners. A single row or column counts as cells too."""
        return _among(self.valid, np.logical_and)

    @cached_property
    def has_no_gap(self) -> bool:
        """Whether all cells are measured."""
        return bool(self.cells.all())

    @cached_property
    def framed_cells(self) -> np.ndarray:
        """The same with a frame of cells outside, which are not measured."""
        return np.pad(self.cells, 1)

    @cached_property
    def filled_cells(self) -> np.ndarray | None:
        """Cells with a filled corner; None where the field has none."""
        filled = self.field.status == Status.FILLED
        return _among(filled, np.logical_or) if filled.any() else None

    @cached_property
    def rates(self) -> np.ndarray:
        """Vorticity + i divergence, NaN where the field's scheme has none: complex (ny, nx)."""
        local = Local(self.field)
        rates = np.empty(self.grid.shape, complex)
        rates.real, rates.imag = local.combined("vx", -1, "uy"), local.combined("ux", 1, "vy")
        return rates

    @cached_property
    def rate_cells(self) -> np.ndarray:
        """Measured cells whose corners all have a vorticity and a divergence."""
        finite = np.isfinite(self.rates)
        return self.cells if finite.all() else self.cells & _among(finite, np.logical_and)

    @cached_property
    def rate_sums(self) -> RunningSums:
        rates = self.rates
        finite = np.isfinite(rates)
        return RunningSums(
            rates if finite.all() else np.where(finite, rates, 0.0), self.grid, self.rate_cells
        )

    @cached_property
    def through_sums(self) -> RunningSums:
        return RunningSums(self.through.reshape(self.grid.shape), self.grid, self.cells)

    @cached_property
    def measured_area(self) -> MeasuredArea:
        return MeasuredArea(self.grid, self.cells)

    @cached_property
    def rate_area(self) -> MeasuredArea:
        """As `measured_area`, of the cells with a vorticity; the same one where all measured cells are."""
        if self.rate_cells is self.cells or np.array_equal(self.rate_cells, self.cells):
            return self.measured_area
        return MeasuredArea(self.grid, self.rate_cells)

    # --- for the full set of numbers ---------------------------------------------------------------

    def extremes(self, name: str) -> BlockExtremes:
        """Of "u", "v", "speed", "vorticity" or "w"."""
        if name not in self._extremes:
            own = {"speed": "speed", "vorticity": "vorticity", "w": "through"}
            values = getattr(self, own[name]) if name in own else getattr(self.field, name).ravel()
            self._extremes[name] = BlockExtremes(values)
        return self._extremes[name]

    @cached_property
    def speed(self) -> np.ndarray:
        """At every node, 0 where not valid: (ny * nx,)."""
        return np.abs(self.velocity)

    @cached_property
    def direction(self) -> np.ndarray:
        """Velocity over speed, complex (ny * nx,); 0 where there is no speed."""
        return self.velocity / np.where(self.speed > 0, self.speed, 1.0)

    @cached_property
    def direction_single(self) -> np.ndarray:
        """The same in single precision, for uncertainties."""
        return self.direction.astype(np.complex64)

    @cached_property
    def vorticity(self) -> np.ndarray:
        """NaN where there is none: (ny * nx,)."""
        return np.ascontiguousarray(self.rates.real).ravel()

    @cached_property
    def velocity_sums(self) -> RunningSums:
        return RunningSums(self.velocity.reshape(self.grid.shape), self.grid, self.cells)

    @cached_property
    def speed_sums(self) -> RunningSums:
        return RunningSums(self.speed.reshape(self.grid.shape), self.grid, self.cells)

    @cached_property
    def direction_sums(self) -> RunningSums:
        return RunningSums(self.direction.reshape(self.grid.shape), self.grid, self.cells)

    @cached_property
    def vorticity_size_sums(self) -> RunningSums:
        """Of the absolute vorticity, 0 where there is none."""
        size = np.abs(np.nan_to_num(self.rates.real))
        return RunningSums(size, self.grid, self.cells)

    @cached_property
    def keys_line(self) -> KeysLine:
        return KeysLine(self.grid)

    @cached_property
    def keys_cells(self) -> np.ndarray:
        """Measured cells whose 4 x 4 nodes all have vectors, framed as `framed_cells`."""
        found = np.zeros(self.framed_cells.shape, bool)
        ny, nx = self.cells.shape
        if min(ny, nx) >= 3:
            near = [self.cells[j : ny - 2 + j, i : nx - 2 + i] for j in range(3) for i in range(3)]
            found[2:-2, 2:-2] = np.logical_and.reduce(near)
        return found

    @cached_property
    def stencils(self) -> dict[str, tuple[Stencil, np.ndarray]]:
        """Along "x" and "y": the scheme's own stencil, and the nodes (ny, nx) at which it is the one used."""
        own = {along: stencil(self.grid, along, self.field.derivative) for along in ("x", "y")}
        return {along: (rule, rule.stands_on(self.valid)) for along, rule in own.items()}

    def of_pair(self, weights: NodeWeights) -> complex:
        """Sum of w conj(U)."""
        return weights.of_pair(self.velocity)


def prepare(field: Field) -> Prepared:
    """Ready a field for measuring regions: what `region.quick_numbers` needs is made at once."""
    ready = Prepared(field)
    _ = ready.framed_cells, ready.filled_cells
    if field.in_plane:
        _ = ready.velocity
    if field.grid.is_plane:
        _ = ready.measured_area
        if field.in_plane:
            _ = ready.rate_sums, ready.rate_area
        if field.w is not None:
            _ = ready.through_sums
    return ready


def _among(nodes: np.ndarray, rule: np.ufunc) -> np.ndarray:
    """The rule over the corners of every cell; along an axis of one node over that node alone."""
    if nodes.shape[1] > 1:
        nodes = rule(nodes[:, 1:], nodes[:, :-1])
    return rule(nodes[1:], nodes[:-1]) if nodes.shape[0] > 1 else nodes
