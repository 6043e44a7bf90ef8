"""Frames made of the whole run: mean, fluctuations and phase averages, measured like any other."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.session.frames import LEFT_OUT
from fieldview.session.measure import measure
from fieldview.session.replay import Workbench, evaluate
from tests.session.runs import CIRCLE, PHASES, edited, pulsing_frames, vortex_frames


@pytest.fixture
def pulsing(tmp_path):
    return pulsing_frames(tmp_path)


@pytest.mark.parametrize("source", [{"frequency": 2.0, "u_frequency": 0.001}, {"channel": "crank"}])
def test_phase_averages_are_measured_like_frames(pulsing, source):
    session = edited(pulsing, phase=source)
    rows = measure(session, "phase:8")
    assert [row["frame"] for row in rows] == [f"phase:8:{number}" for number in range(8)]
    steady = measure(session, "mean")[0]["regions"][0]["circulation"]
    single = measure(session, "3")[0]["regions"][0]["circulation"]
    for number, row in enumerate(rows):
        (core,) = row["regions"]
        found = core["circulation"]
        wanted = steady["value"] * (1 + 0.5 * np.cos(2 * np.pi * number / PHASES))
        # four frames a bin: half the random part of one frame
        assert found["uncertainty"]["random"] == pytest.approx(single["uncertainty"]["random"] / 2, rel=1e-9)
        assert abs(found["value"] - wanted) < 4 * np.hypot(
            found["uncertainty"]["random"], steady["uncertainty"]["random"]
        )
        assert any(f"phase {45 * number}°" in said and "4 frames" in said for said in core["warnings"])


def test_a_phase_needs_to_be_said_and_its_bins_filled(pulsing):
    with pytest.raises(InputError, match=r'add "phase": .*"frequency"'):
        measure(pulsing, "phase:8")
    session = edited(pulsing, phase={"frequency": 2.0})
    with pytest.raises(InputError, match=r"no frame falls into the phase bin at 22.5°; use fewer"):
        evaluate(session, "phase:16:1")
    with pytest.raises(InputError, match="no channel"):
        evaluate(edited(pulsing, phase={"channel": "handle"}), "phase:8:0")
    with pytest.raises(ValueError, match="either channel or frequency"):
        edited(pulsing, phase={"unit": "deg"})


def test_fluctuations_come_several_at_a_time_and_the_mean_is_made_once(pulsing):
    bench, asked = Workbench(pulsing), []
    replay = bench._state
    bench._state = lambda frame, count: asked.append(frame) or replay(frame, count)
    fields = [bench.field(frame) for frame in bench.frames("fluctuation:0:3")]
    assert len(asked) == 4 * PHASES + 3
    mean = bench.field("mean")
    for number, field in enumerate(fields):
        np.testing.assert_array_equal(field.u, bench.field(number).u - mean.u)


def test_the_noise_is_estimated_once_and_not_for_every_frame(tmp_path):
    session = edited(
        vortex_frames(tmp_path, 12),
        regions=[CIRCLE],
        error_model={"sigma": "estimate", "correlation_nodes": 1},
    )
    bench, asked = Workbench(session), []
    placed = bench._placed
    bench._placed = lambda frame: asked.append(frame) or placed(frame)
    for number in range(12):
        bench.field(number)
    assert len(asked) == len(set(asked)) == 8


def test_a_mean_leaves_out_what_cannot_be_read_and_says_so(tmp_path):
    session = edited(vortex_frames(tmp_path, 4), regions=[CIRCLE])
    (tmp_path / "f2.csv").write_text("x [m],y [m],u [m/s],v [m/s]\n0,0,nonsense,1\n")
    (row,) = measure(session, "mean")
    said = row["regions"][0]["warnings"]
    assert any("mean over 3 frames" in sentence for sentence in said)
    assert any(sentence.startswith(f"{LEFT_OUT}2: ") and "f2.csv" in sentence for sentence in said)
