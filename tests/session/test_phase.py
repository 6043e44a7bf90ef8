"""Phase averages: the cycle found again, the jitter measured, and what is smeared said."""

import json

import numpy as np
import pytest

from fieldview.compute.error_model import ErrorModel
from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.grid import Grid
from fieldview.session.phase import PhaseAverages, PhaseRule, phase_averages
from fieldview.session.replay import Workbench
from tests.session.runs import vortex_frames

GRID = Grid(np.arange(6.0), np.arange(5.0))


def cycle(phases, *, sigma=0.1, times=None, seed=1):
    """Frames of u = cos(phase), v = 3 + sin(phase) with noise; phases in cycles."""
    rng = np.random.default_rng(seed)
    error = ErrorModel(sigma={"u": sigma, "v": sigma}, origin="given")
    for number, phase in enumerate(phases):
        turn = np.exp(2j * np.pi * phase)
        u, v = sigma * rng.normal(size=(2, *GRID.shape)) + np.array([turn.real, 3 + turn.imag])[:, None, None]
        channels = {"crank": np.full(GRID.shape, 360 * phase - 720), "mixed": 20 * GRID.nodes.real}
        time = None if times is None else times[number]
        yield Field(GRID, u=u, v=v, error=error, channels=channels, time=time)


def averaged(rule, frames) -> PhaseAverages:
    averages = PhaseAverages(rule)
    for frame in frames:
        averages.add(frame)
    return averages


def test_the_cycle_is_found_again_in_its_bins():
    phases = np.random.default_rng(2).uniform(0, 40, 800)
    averages = averaged(PhaseRule(8, channel="crank"), cycle(phases))
    assert sum(len(b.offsets) for b in averages.bins) == 800 and averages.left_out == 0
    for number, row in enumerate(averages.rows()):
        mean, turn = averages.field(number), np.exp(2j * np.pi * number / 8)
        # a bin an eighth of a cycle wide keeps sin(pi/8)/(pi/8) of the first harmonic
        assert row["first_harmonic_kept"] == pytest.approx(0.9745, abs=0.005)
        assert row["jitter_deg"] == pytest.approx(45 / np.sqrt(12), rel=0.1)
        kept = turn * np.exp(2j * np.pi * averages.bins[number].shift) * row["first_harmonic_kept"]
        assert np.mean(mean.u) == pytest.approx(kept.real, abs=0.015)
        assert np.mean(mean.v) == pytest.approx(3 + kept.imag, abs=0.015)
        assert any(f"phase {45 * number}° ± 22.5°" in note for note in mean.notes)


def test_a_frequency_stands_in_for_the_channel():
    times = np.arange(300) * 0.08
    phases = 2.0 * times
    by_channel = averaged(PhaseRule(5, channel="crank"), cycle(phases, times=times))
    by_frequency = averaged(PhaseRule(5, frequency=2.0, u_frequency=0.001), cycle(phases, times=times))
    for number in range(5):
        assert (by_channel.field(number).u == by_frequency.field(number).u).all()
    drift = by_frequency.rows()[0]["drift_deg"]
    assert drift == pytest.approx(360 * 0.001 * np.std(by_frequency.bins[0].times))
    assert any("uncertain by" in note for note in by_frequency.field(0).notes)
    assert by_channel.rows()[0]["drift_deg"] is None


def test_narrow_bins_leave_frames_out_and_keep_more():
    phases = np.random.default_rng(3).uniform(0, 1, 800)
    narrow = averaged(PhaseRule(8, channel="crank", width=0.05), cycle(phases))
    assert narrow.left_out == pytest.approx(800 * 0.6, rel=0.1)
    assert min(b.kept() for b in narrow.bins) > 0.99
    assert json.loads(json.dumps(narrow.rows(), allow_nan=False)) == narrow.rows()


def test_the_noise_of_a_phase_average_is_that_of_its_frames():
    averages = averaged(PhaseRule(4, channel="crank"), cycle(np.arange(64) / 16))
    mean = averages.field(1)
    assert np.unique(mean.error.sigma["u"]) == pytest.approx([0.1 / np.sqrt(16)])


def test_an_empty_bin_is_refused_and_its_row_is_null():
    averages = averaged(PhaseRule(8, channel="crank"), cycle(np.zeros(5)))
    assert averages.rows()[3]["jitter_deg"] is None and averages.rows()[3]["frames"] == 0
    with pytest.raises(InputError, match="no frame falls into the phase bin at 135°; use fewer or wider"):
        averages.field(3)
    with pytest.raises(InputError, match="phase bin 8 does not exist; the bins are 0 to 7"):
        averages.field(8)


def test_a_session_s_run(tmp_path):
    bench = Workbench(vortex_frames(tmp_path / "run", 3))
    with pytest.raises(InputError, match="need the times of the frames"):
        phase_averages(bench, PhaseRule(2, frequency=1.0))
    with pytest.raises(InputError, match='no channel "crank"; its channels are: none'):
        phase_averages(bench, PhaseRule(2, channel="crank"))


@pytest.mark.parametrize(
    ("keys", "message"),
    [
        ({"bins": 0, "channel": "crank"}, "asked in 0 bins"),
        ({"bins": 8}, "either a phase channel or a frequency"),
        ({"bins": 8, "channel": "crank", "frequency": 2.0}, "either a phase channel or a frequency"),
        ({"bins": 8, "channel": "crank", "unit": "gon"}, 'unit of the phase is "gon"'),
        ({"bins": 8, "frequency": -1.0}, "give a positive one"),
        ({"bins": 8, "frequency": 2.0, "width": 0.2}, "8 bins leave room for 0.125 at most"),
    ],
)
def test_rules_that_make_no_sense(keys, message):
    with pytest.raises(InputError, match=message):
        PhaseRule(**keys)


def test_a_channel_that_is_no_phase_is_refused():
    with pytest.raises(InputError, match='channel "mixed" is not one phase over the frame'):
        averaged(PhaseRule(2, channel="mixed"), cycle([0.1]))
