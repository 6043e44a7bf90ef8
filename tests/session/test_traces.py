"""Traces of probes and regions, and what they say."""

import json

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid, Placement
from fieldview.session.measure import measure_frames
from fieldview.session.models import Session
from fieldview.session.replay import Workbench
from fieldview.session.traces import probe_trace, region_trace, trace_row
from tests.session.runs import edited, vortex_frames
from tests.session.test_check import FramesInMemory

INTERVAL = 0.08
CONVECTION, WAVELENGTH = 0.229, 0.115
"""A street that passes at 1.991 Hz."""


def street(count=48, *, sigma=0.01, seed=1, missing=0.1, time=True, grid=None, flow=None):
    """Workbench on frames of a wave travelling along x, v = 0.05 sin(2 pi (x - U t) / L), on a stream."""
    rng = np.random.default_rng(seed)
    grid = grid or Grid(np.arange(30) * 0.003, np.arange(20) * 0.003)
    frames = []
    for number in range(count):
        x = grid.nodes.real - CONVECTION * INTERVAL * number
        v = 0.05 * np.sin(2 * np.pi * x / WAVELENGTH)
        parts = {"u": np.full(grid.shape, 0.2), "v": v}
        parts = {name: part + sigma * rng.normal(size=grid.shape) for name, part in parts.items()}
        gone = rng.random(grid.shape) < missing
        parts = {name: np.where(gone, np.nan, part) for name, part in parts.items()}
        frames.append(Field(grid, **parts, time=INTERVAL * number if time else None))
    session = Session.model_validate(
        {
            "run": {"files": ["held in memory"]},
            "error_model": {"sigma": sigma, "correlation_nodes": 1},
            "regions": [{"name": "cell", "shape": "rectangle", "corners": [[0.02, 0.01], [0.05, 0.03]]}],
        }
    )
    return Workbench(session, run=FramesInMemory(frames, frames[0].units))


def test_the_passing_frequency_is_recovered_within_its_uncertainty():
    true, ratios = CONVECTION / WAVELENGTH, []
    for seed in range(12):
        trace = probe_trace(street(seed=seed), (0.0444, 0.0303), "v")
        found = trace.dominant_frequency()
        ratios.append((found.frequency - true) / found.uncertainty)
        assert 0.2 < trace.missing / 48 < 0.6 and found.uncertainty < 0.02
    assert np.max(np.abs(ratios)) < 3.5 and 0.5 <= np.std(ratios) <= 1.6


def test_a_trace_row_says_it_all_in_strict_json():
    trace = probe_trace(street(missing=0.0), (0.0444, 0.0303), "v")
    base = {"length": 0.03, "length_name": "peak-to-peak heave", "velocity": 0.2, "u_velocity": 0.002}
    row = trace_row(trace, **base)
    assert json.loads(json.dumps(row, allow_nan=False)) == row
    assert row["mean"]["unit"] == "m/s" and row["interval"] == pytest.approx(INTERVAL)
    frequency = row["dominant_frequency"]
    assert frequency["value"] == pytest.approx(1.991, abs=4 * frequency["uncertainty"])
    assert frequency["share"] > 0.9 and frequency["amplitude"] == pytest.approx(0.05, rel=0.1)
    assert row["strouhal"]["value"] == pytest.approx(frequency["value"] * 0.15, rel=1e-12)
    assert row["strouhal"]["not_stated"] == ["peak-to-peak heave"]
    assert row["deviation"]["value"] == pytest.approx(0.05 / np.sqrt(2), rel=0.1)


def test_frames_without_times_are_counted_in_frames():
    trace = probe_trace(street(time=False, missing=0.0), (0.0444, 0.0303), "v")
    row = trace_row(trace)
    assert row["dominant_frequency"]["unit"] == "1/frame" and row["integral_time"]["unit"] == "frame"
    assert row["dominant_frequency"]["value"] == pytest.approx(1.991 * INTERVAL, rel=0.02)
    assert any("not known" in remark for remark in row["remarks"])
    with pytest.raises(InputError, match="needs the times of the frames"):
        trace_row(trace, length=0.03, length_name="chord", velocity=0.2)


def test_a_probe_is_bilinear_also_on_turned_axes_and_a_node_alone_needs_no_neighbour():
    turned = Grid(np.arange(8.0), np.arange(6.0), Placement(factor=1j, shift=2 + 1j))
    field = Field(turned, u=turned.nodes.real * 2 + 1, v=turned.nodes.imag - 3, time=0.0)
    bench = Workbench(
        Session.model_validate({"run": {"files": ["x"]}}), run=FramesInMemory([field], field.units)
    )
    point = complex(turned.placement.to_plane(3.3 + 2.7j))
    found = probe_trace(bench, (point.real, point.imag), "u")
    assert found.values[0] == pytest.approx(2 * point.real + 1, rel=1e-12)
    holed = field.with_(u=np.where(np.indices(turned.shape)[1] == 4, np.nan, field.u), status=None)
    bench = Workbench(bench.session, run=FramesInMemory([holed], field.units))
    assert np.isnan(probe_trace(bench, (point.real, point.imag), "u").values[0])
    node = complex(turned.nodes[2, 3])
    assert probe_trace(bench, (node.real, node.imag), "u").values[0] == pytest.approx(2 * node.real + 1)
    with pytest.raises(InputError, match="lies outside the grid along"):
        probe_trace(bench, (50.0, 0.0), "u")


def test_a_region_s_trace_is_what_is_measured(tmp_path):
    session = edited(
        vortex_frames(tmp_path / "run", 4),
        error_model={"sigma": 0.004, "correlation_nodes": 1},
        regions=[{"name": "core", "shape": "circle", "centre": [0.02, 0.016], "radius": 0.006}],
    )
    bench = Workbench(session)
    rows = [row["regions"][0]["circulation"] for row in measure_frames(bench, range(4))]
    trace = region_trace(bench, "core")
    assert list(trace.values) == [row["value"] for row in rows] and trace.unit == "m^2/s"
    assert list(trace.uncertainties) == [row["uncertainty"]["random"] for row in rows]
    assert trace_row(trace)["mean"]["uncertainty"] is None
    with pytest.raises(InputError, match='no region "rim"; the regions are: core'):
        region_trace(bench, "rim")
    with pytest.raises(InputError, match='no number "lift"; it has: circulation'):
        region_trace(bench, "core", "lift")
    with pytest.raises(InputError, match='"core" has no line_integral'):
        region_trace(bench, "core", "line_integral")


def test_a_region_s_flux_has_the_passing_frequency_and_a_spectrum():
    trace = region_trace(street(missing=0.0, count=96), "cell", "circulation")
    found = trace.dominant_frequency()
    assert found.frequency == pytest.approx(1.991, abs=4 * found.uncertainty)
    density = trace.spectrum(segment=96, window="boxcar", overlap=0.0)
    assert density.frequency[np.argmax(density.density)] == pytest.approx(1.991, abs=0.14)
    assert density.density.sum() * density.frequency[1] == pytest.approx(trace.values.var(), rel=1e-9)
    assert trace.convergence().count[-1] == 96
