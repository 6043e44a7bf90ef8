"""The sample of a fin's wake: frequency, statistics, phases, modes and check say what was put in."""

import numpy as np
import pytest

from fieldview.publish.samples import fin_wake, write_sample
from fieldview.session.check import run_check
from fieldview.session.findings import FINE, UNKNOWN
from fieldview.session.modes import run_modes
from fieldview.session.phase import PhaseRule, phase_averages
from fieldview.session.replay import Workbench
from fieldview.session.statistics import run_statistics
from fieldview.session.store import load_session
from fieldview.session.traces import probe_trace, trace_row

PASSING = fin_wake.CONVECTION / fin_wake.SPACING
"""Rate at which the vortices of a row pass: the fin's 2.0 Hz. [Hz]"""


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    return Workbench(
        load_session(write_sample("fin_wake", tmp_path_factory.mktemp("samples"))), cache_bytes=10**9
    )


def test_the_frequency_is_recovered_within_its_uncertainty(bench):
    ratios = []
    for x in (0.09, 0.12, 0.15, 0.18):
        for y in (-0.03, 0.003, 0.03):
            found = probe_trace(bench, (x, y), "v").dominant_frequency()
            ratios.append((found.frequency - PASSING) / found.uncertainty)
            assert found.frequency == pytest.approx(fin_wake.FREQUENCY, abs=0.02)
            assert found.uncertainty < 0.02 and found.chance < 1e-6
    assert np.max(np.abs(ratios)) < 3 and 0.3 < np.sqrt(np.mean(np.square(ratios))) < 1.5


def test_strouhal_number_of_the_heave(bench):
    row = trace_row(
        probe_trace(bench, (0.12, 0.0), "v"),
        length=fin_wake.HEAVE,
        length_name="peak-to-peak heave",
        velocity=fin_wake.STREAM,
        u_length=0.0002,
        u_velocity=0.001,
    )
    number = row["strouhal"]
    assert number["value"] == pytest.approx(0.30, abs=2 * number["uncertainty"]["combined"])


def test_a_row_away_from_the_axis_has_one_frequency_and_the_axis_its_double(bench):
    found = probe_trace(bench, (0.12, 0.0), "u").dominant_frequency()
    assert found.frequency == pytest.approx(2 * PASSING, abs=3 * found.uncertainty)


def test_the_check_is_content_and_finds_the_noise(bench):
    check = run_check(bench)
    assert {found.concern for found in check.findings} <= {FINE, UNKNOWN}
    assert [found.item for found in check.findings if found.concern == UNKNOWN] == ["peak locking"]
    stated = bench.session.error_model.sigma["u"]
    assert check.sigma["neighbours"]["u"] == pytest.approx(stated, rel=0.05)
    assert check.sigma["divergence"]["u"] == pytest.approx(stated, rel=0.05)
    assert not check.resolved["v"]


def test_the_mean_is_the_run_s_and_the_stresses_are_the_wake_s(bench):
    run = run_statistics(bench)
    mean = bench.field("mean")
    np.testing.assert_allclose(run.mean.u, mean.u, rtol=1e-12)
    maps = run.maps(subtract_noise=True)
    # v swings most between the two rows
    grid = run.mean.grid
    stress = np.nanmean(maps["reynolds_vv"].values[:, grid.x > 0.06], axis=1)
    assert abs(grid.y[np.argmax(stress)]) < fin_wake.ROW_DISTANCE / 2
    assert stress[[0, -1]].max() < 0.2 * stress.max()


def test_phase_averages_show_the_street_that_a_mean_smears(bench):
    averages = phase_averages(bench, PhaseRule(5, frequency=PASSING))
    swings = [np.nanstd(averages.field(number).v) for number in range(5)]
    assert min(swings) > 5 * np.nanstd(bench.field("mean").v)
    assert min(row["frames"] for row in averages.rows()) >= 8


def test_a_street_is_carried_by_two_pairs_of_modes(bench):
    found = run_modes(bench, count=6)
    shares = found.modes.shares
    assert shares[:2].sum() > 0.7 and shares[:4].sum() > 0.9 and shares[4] < 0.5 * shares[3]
    assert found.modes.settled
