"""Applying a session to a run, against the bare computing functions in a loop on arrays in memory."""

from time import perf_counter

import numpy as np

from fieldview.compute import filling, validation
from fieldview.compute.field import Event, Status
from fieldview.compute.region import measure_region, prepare
from fieldview.publish.applying import apply_session
from fieldview.session.replay import Workbench
from fieldview.session.store import load_session
from tests.turbid import SIGMA, turbid_run

FRAMES, ROUNDS = 12, 3


def test_applying_runs_at_half_the_speed_of_the_bare_functions(tmp_path):
    path = turbid_run(tmp_path, FRAMES)
    session = load_session(path)
    bench = Workbench(session)
    raw = [bench.field(frame, upto=0) for frame in range(FRAMES)]
    shapes = [region.outline() for region in session.regions]

    def bare() -> None:
        for field in raw:
            verdict = validation.median_test(
                field.u, field.v, radius=1, threshold=2.0, floor={"u": SIGMA, "v": SIGMA}
            )
            field = field.reject(verdict.rejected, Event(0, "median_test", "rejected", verdict.rejected))
            wanted = field.status != Status.MEASURED
            filled = filling.fill_map(field.grid, field.valid, wanted, method="linear")
            field = field.mapped(filled, np.where(filled.filled, Status.FILLED, field.status))
            ready = prepare(field)
            for shape in shapes:
                measure_region(field, shape, prepared=ready)

    times: tuple[list, list] = ([], [])
    for number in range(ROUNDS):
        start = perf_counter()
        bare()
        middle = perf_counter()
        apply_session(
            path,
            tmp_path / f"out{number}",
            to="npz",
            progress=lambda frames, what, total: frames,
            say=lambda sentence: None,
        )
        times[0].append(middle - start)
        times[1].append(perf_counter() - middle)
    ratio = float(np.median(times[0]) / np.median(times[1]))
    per_frame = 1e3 * np.median(times[1]) / FRAMES
    print(f"apply runs at {ratio:.2f} of the speed of the bare functions, {per_frame:.0f} ms a frame")
    assert ratio >= 0.5
