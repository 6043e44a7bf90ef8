"""The outputs of ``loopflux choices``, ``compare`` and ``repeats``."""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Executor
from dataclasses import dataclass
from pathlib import Path

from fieldview.compute.errors import InputError
from fieldview.publish import wording
from fieldview.publish.maps import check_ending, write_maps
from fieldview.publish.measuring import Progress
from fieldview.publish.outputs import as_text
from fieldview.publish.region_numbers import symbol
from fieldview.publish.remarks import Remarks
from fieldview.publish.studies import choices_study
from fieldview.session.choices import TITLES, Study
from fieldview.session.comparison import Comparison, compare
from fieldview.session.measure import frame_row
from fieldview.session.repeats import Repeat, repeats
from fieldview.session.replay import Frame, Workbench
from fieldview.session.store import load_session


@dataclass(frozen=True)
class Output:
    """How an output is wanted, and who is told of what happens on the way."""

    format: str
    progress: Progress
    say: Callable[[str], None]


def one_frame(bench: Workbench, spec: str) -> Frame:
    """The frame meant by a text that must mean one. InputError where it means several."""
    frames = bench.frames(spec)
    if len(frames) != 1:
        raise InputError(f'frames "{spec}": name one frame here, such as 0, mean or phase:8:0')
    return frames[0]


# --- choices ---------------------------------------------------------------------------------------


def choices_report(
    path: Path, region: str | None, frame: str, output: Output, *, executor: Executor | None = None
) -> tuple[str, bool]:
    """The choices study of one region, or of all, on one frame; and whether there was anything to remark."""
    bench = Workbench(load_session(path))
    remarks = Remarks(output.say, bench)
    chosen = one_frame(bench, frame)
    names = [region] if region is not None else [entry.name for entry in bench.session.regions]
    if not names:
        raise InputError(f"{path}: has no regions to study; draw one in the window or add it under regions")
    studies = [
        choices_study(bench, name, chosen, progress=output.progress, executor=executor) for name in names
    ]
    document = {"session": path.name, "frame": chosen, "studies": [study_row(study) for study in studies]}
    rows = [{"region": study.region} | row for study in studies for row in study.summary()]
    lines = (line for study in studies for line in study_lines(study))
    return as_text(output.format, document, rows, lines), bool(remarks)


def study_row(study: Study) -> dict:
    """In strict JSON."""
    return {
        "region": study.region,
        "choices": {factor: list(names) for factor, names in study.choices.items()},
        "numbers": study.summary(),
        "remarks": study.remarks(),
    }


def study_lines(study: Study) -> Iterator[str]:
    """The study as text."""
    yield f"{study.region}, frame {study.frame}: {len(study.rows)} combinations of defensible choices"
    yield ""
    for row in study.summary():
        measured = row["measured"]
        combined = measured["uncertainty"]["combined"]
        yield f"  {symbol(row['number']):<10} {wording.plus_minus(measured['value'], combined, row['unit'])}"
        if row["deviation"] is None:
            yield "             fewer than two combinations have a value"
            continue
        scatter, _ = wording.pair(row["deviation"], None, digits=2)
        ratio = row["deviation_over_uncertainty"]
        beside = "U unknown" if ratio is None else f"{wording.short(ratio, digits=2)} of the uncertainty"
        yield f"             the analyst: ± {scatter} {wording.unit_text(row['unit'])}, {beside}"
        span = f"{wording.short(row['lowest'], digits=4)} … {wording.short(row['highest'], digits=4)}"
        yield f"             from {span}"
        for factor, alone in row["alone"].items():
            if alone["deviation"]:
                each, _ = wording.pair(alone["deviation"], None, digits=2)
                yield f"               {TITLES[factor]} alone: ± {each}"
    yield ""
    yield from (f"  ! {sentence}" for sentence in study.remarks())


# --- comparison ------------------------------------------------------------------------------------


def comparison_report(
    first: Path,
    second: Path,
    frames: tuple[str, str],
    output: Output,
    *,
    coverage_factor: float,
    shared_calibration: bool,
    maps: Path | None,
) -> tuple[str, bool]:
    """Two frames side by side; with ``maps`` the difference and its uncertainty go to that file."""
    check_ending(maps)
    benches = [Workbench(load_session(path)) for path in (first, second)]
    remarks = Remarks(output.say, *benches)
    numbers = [one_frame(bench, spec) for bench, spec in zip(benches, frames, strict=True)]
    fields = [bench.field(frame) for bench, frame in zip(benches, numbers, strict=True)]
    found = compare(
        benches[0].session,
        *fields,
        coverage_factor=coverage_factor,
        shared_calibration=shared_calibration,
    )
    if maps is not None:
        unit = found.difference.units.velocity
        values = {
            f"{name}_uncertainty": (spread, unit)
            for name, spread in found.uncertainties.items()
            if spread is not None
        }
        write_maps(maps, found.difference, values, session=first)
    document = {
        "first": {"session": first.name, "frame": numbers[0]},
        "second": {"session": second.name, "frame": numbers[1]},
        "shared_calibration": shared_calibration,
        "components": found.component_rows(),
        "regions": found.region_rows(),
    }
    return as_text(output.format, document, found.region_rows(), comparison_lines(found)), bool(remarks)


def comparison_lines(found: Comparison) -> Iterator[str]:
    """The comparison as text."""
    shared = "common to both and drop out" if found.shared_calibration else "independent of each other"
    yield f"second less first; systematic errors are taken as {shared}"
    yield ""
    for row in found.component_rows():
        unit = wording.unit_text(row["unit"])
        yield (
            f"  {row['component']}: mean {wording.short(row['mean'])} {unit}, deviation "
            f"{wording.short(row['deviation'])} {unit} at {row['nodes']} of {row['nodes_of_grid']} nodes"
        )
        if row["share_beyond"] is None:
            yield "     no sigma is known, so it cannot be said what is more than noise"
        else:
            yield (
                f"     expected of the random errors {wording.short(row['expected_deviation'])} {unit}; "
                f"{wording.percent(row['share_beyond'])} of the nodes differ by more than "
                f"{row['coverage_factor']:g} u"
            )
    for row in found.region_rows():
        sides = [
            wording.plus_minus(row[side]["value"], row[side]["uncertainty"]["combined"], row[side]["unit"])
            for side in ("first", "second", "difference")
        ]
        beyond = {None: "", True: "   differs", False: "   within its uncertainty"}[row["beyond"]]
        yield ""
        yield f"  {row['region']}, {symbol(row['number'])}"
        yield f"     {sides[0]} and {sides[1]}"
        yield f"     difference {sides[2]}{beyond}"


# --- repeats ---------------------------------------------------------------------------------------


def repeats_report(paths: Sequence[Path], frames: str, output: Output) -> tuple[str, bool]:
    """Scatter of every region number over sessions, or over the frames of one, against what is stated."""
    benches = {path: Workbench(load_session(path)) for path in paths}
    remarks = Remarks(output.say, *benches.values())
    if len(benches) != len(paths):
        raise InputError("a session is named twice; a repeat counts once")
    asked: list[tuple[str, Workbench, Frame]] = []
    if len(benches) == 1:
        (bench,) = benches.values()
        asked = [(f"frame {frame}", bench, frame) for frame in bench.frames(frames)]
    else:
        asked = [(str(path), bench, one_frame(bench, frames)) for path, bench in benches.items()]
    measured = {
        name: frame_row(bench.session, frame, bench.field(frame))
        for name, bench, frame in output.progress(asked, "measuring", len(asked))
    }
    found = repeats(measured)
    rows = [repeat.row() for repeat in found]
    document = {"repeats": list(measured), "numbers": rows}
    return as_text(output.format, document, rows, repeat_lines(found, len(measured))), bool(remarks)


def repeat_lines(found: Sequence[Repeat], count: int) -> Iterator[str]:
    """The repeats as text."""
    yield f"{count} repeats; scatter is Type A, stated is the random standard uncertainty of one"
    for repeat in found:
        row = repeat.row()
        yield ""
        yield f"  {row['region']}, {symbol(row['number'])}"
        mean = wording.plus_minus(row["mean"], row["mean_uncertainty"], row["unit"])
        yield f"     mean {mean} from {row['repeats']} repeats"
        stated = wording.short(row["stated"], digits=2)
        yield (
            f"     scatter {wording.short(row['deviation'], digits=2)}, stated {stated} "
            f"{wording.unit_text(row['unit'])}, Birge ratio {wording.short(row['birge_ratio'], digits=2)}"
        )
        yield from textwrap.wrap(row["verdict"], 92, initial_indent="     ", subsequent_indent="     ")
        if row["without_value"]:
            yield f"     {row['without_value']} repeats have no value"
