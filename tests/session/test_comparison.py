"""Two frames side by side, and repeats: known differences found, honest uncertainties recognised."""

import numpy as np
import pytest

from fieldview.compute.errors import InputError
from fieldview.session.comparison import compare
from fieldview.session.measure import frame_row
from fieldview.session.repeats import Repeat, repeats
from fieldview.session.replay import Workbench
from tests.session.runs import CIRCLE, SIGMA, X, edited, vortex_frames, write_frame

MODEL = {"sigma": SIGMA, "correlation_nodes": 1, "window": 0}


@pytest.fixture
def bench(tmp_path):
    return Workbench(edited(vortex_frames(tmp_path, 6), regions=[CIRCLE], error_model=MODEL))


def test_frames_that_differ_by_noise_differ_by_as_much_as_stated(bench):
    first = bench.field(0)
    rng = np.random.default_rng(9)
    parts = {name: part + rng.normal(0, SIGMA, part.shape) for name, part in first.components.items()}
    second = first.with_(**parts, measured=parts)
    quiet = first.with_(error=bench.field(1).error)
    found = compare(bench.session, quiet, second)
    for row in found.component_rows():
        assert row["expected_deviation"] == pytest.approx(2**0.5 * SIGMA)
        assert row["deviation"] == pytest.approx(SIGMA, rel=0.15)
        assert row["nodes"] == row["nodes_of_grid"] == first.status.size
        # normal errors of half the variance: beyond 2 sqrt(2) sigma at 0.47 % of the nodes
        assert row["share_beyond"] < 0.03


def test_a_real_change_is_found_with_its_uncertainty(bench):
    first = bench.field(0)
    parts = {name: 1.5 * part for name, part in first.components.items()}
    found = compare(bench.session, first, first.with_(**parts, measured=parts))
    one, other, difference = found.regions["core"]["circulation"]
    assert difference.value == pytest.approx(other.value - one.value) == pytest.approx(0.5 * one.value)
    assert difference.random == pytest.approx(2**0.5 * one.random)
    (row,) = [row for row in found.region_rows() if row["number"] == "circulation"]
    assert row["beyond"] is True
    assert np.allclose(found.difference.u, 0.5 * first.u) and found.difference.error.sigma is not None


def test_a_shared_calibration_drops_out_of_a_difference(tmp_path):
    model = MODEL | {"systematic": {"scale": 0.01, "zero_offset": 0.001}}
    bench = Workbench(edited(vortex_frames(tmp_path, 1), regions=[CIRCLE], error_model=model))
    field = bench.field(0)
    same = compare(bench.session, field, field, shared_calibration=True)
    apart = compare(bench.session, field, field)
    for found, wanted in ((same, 0.0), (apart, 2**0.5)):
        one, _, difference = found.regions["core"]["circulation"]
        assert difference.value == 0 and difference.systematic == pytest.approx(wanted * one.systematic)
    parts = {name: 1.5 * part for name, part in field.components.items()}
    grown = compare(bench.session, field, field.with_(**parts, measured=parts), shared_calibration=True)
    one, _, difference = grown.regions["core"]["circulation"]
    assert difference.systematic == pytest.approx(0.5 * one.systematic)


def test_what_cannot_be_compared_is_refused(bench, tmp_path):
    field = bench.field(0)
    (tmp_path / "other").mkdir()
    write_frame(tmp_path / "other/f.csv", field.u, field.v, x=X + 0.0007)
    other = Workbench(edited(bench.session, run={"files": ["other/*.csv"]})).field(0)
    with pytest.raises(InputError, match="not on the same nodes"):
        compare(bench.session, field, other)
    with pytest.raises(InputError, match="no component in common"):
        compare(bench.session, field.with_(v=None, measured={}), field.with_(u=None, measured={}))
    with pytest.raises(InputError, match="coverage factor"):
        compare(bench.session, field, field, coverage_factor=0)


def test_a_missing_sigma_is_said_and_not_taken_for_zero(bench):
    from fieldview.compute.error_model import ErrorModel

    bare = bench.field(1).with_(error=ErrorModel())
    found = compare(bench.session, bench.field(0), bare)
    assert found.uncertainties == {"u": None, "v": None} and found.difference.error.sigma is None
    assert all(row["share_beyond"] is None for row in found.component_rows())
    assert found.regions["core"]["circulation"][2].combined is None


def repeated(stated: float, *, count: int = 40, seed: int = 0) -> Repeat:
    values = tuple(np.random.default_rng(seed).normal(1.0, 0.1, count))
    return Repeat("r", "circulation", "m^2/s", values, (stated,) * count, 0)


def test_the_birge_ratio_tells_honest_uncertainties_from_others():
    ratios = [repeated(0.1, count=6, seed=seed).birge_ratio ** 2 for seed in range(400)]
    # chi squared over 5 degrees of freedom: mean 1, variance 2/5
    assert np.mean(ratios) == pytest.approx(1.0, abs=3 * np.sqrt(0.4 / 400))
    assert "scatter as stated" in repeated(0.1).verdict()
    assert "too small" in repeated(0.05).verdict() and "too large" in repeated(0.2).verdict()
    assert "no random uncertainty" in Repeat("r", "flux", "m^2/s", (1.0, 2.0, 3.0), None, 0).verdict()
    assert repeated(0.0).birge_ratio is None


def test_a_worked_example_of_type_a_evaluation():
    """JCGM 100:2008, 4.4.3: twenty temperatures, mean 100.14 °C, s = 1.49 °C, s of the mean 0.33 °C."""
    temperatures = (
        96.90, 98.18, 98.25, 98.61, 99.03, 99.49, 99.56, 99.74, 99.89, 100.07,
        100.33, 100.42, 100.68, 100.95, 101.11, 101.20, 101.57, 101.84, 102.36, 102.72,
    )  # fmt: skip
    row = Repeat("bath", "temperature", "°C", temperatures, None, 0).row()
    assert row["mean"] == pytest.approx(100.145, abs=5e-3)
    assert row["deviation"] == pytest.approx(1.489, abs=5e-4)
    assert row["mean_uncertainty"] == pytest.approx(0.333, abs=5e-4)


def test_repeats_of_a_steady_vortex_agree_with_their_noise(tmp_path):
    rows = {}
    for seed in range(12):
        session = edited(vortex_frames(tmp_path / str(seed), seed=seed), regions=[CIRCLE], error_model=MODEL)
        rows[str(seed)] = frame_row(session, 0, Workbench(session).field(0))
    found = {repeat.number: repeat for repeat in repeats(rows)}
    assert 0.5 < found["circulation"].birge_ratio < 1.6 and found["flux"].without == 0
    with pytest.raises(InputError, match="give at least 3"):
        repeats(dict(list(rows.items())[:2]))
    drifting = Workbench(edited(vortex_frames(tmp_path / "d", 12), regions=[CIRCLE], error_model=MODEL))
    moved = {str(n): frame_row(drifting.session, n, drifting.field(n)) for n in range(12)}
    assert "was not the same each time" in repeats(moved)[0].verdict()
    renamed = rows["0"] | {"regions": [rows["0"]["regions"][0] | {"name": "other"}]}
    with pytest.raises(InputError, match="no region of the same name"):
        repeats(rows | {"0": renamed})
