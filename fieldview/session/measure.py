"""Every region on every frame: the numbers of the window, the tables, the reports and the command line."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator

from fieldview.compute.errors import InputError
from fieldview.compute.field import Field
from fieldview.compute.numbers import Number
from fieldview.compute.region import RegionNumbers, measure_region, prepare
from fieldview.files import UnreadableFrame
from fieldview.session.models import Session
from fieldview.session.regions import Region
from fieldview.session.replay import Frame, Workbench

NUMBERS = {
    "circulation": "circulation",
    "flux": "flux",
    "vorticity_integral": "vorticity_integral",
    "divergence_integral": "divergence_integral",
    "line_integral": "line_integral",
    "cross_flow": "cross_flow",
    "through_flow": "through_flow",
}
"""Numbers of a region in the order of its row: key of the row and attribute of RegionNumbers."""

CAUTION = (
    "a through-plane flow used for ventilation, fume-cupboard or other safety decisions needs the method, "
    "instrument and competence that the local code asks for"
)


def measure(
    session: Session,
    frames: str | Frame | Iterable[Frame] | None = None,
    *,
    on_skip: Callable[[Frame, InputError], None] | None = None,
) -> list[dict]:
    """Every region on the chosen frames, as the ``frames`` list of ``loopflux measure --format json``.

    Parameters
    ----------
    session : Session
    frames : optional
        Numbers, a text like ``"0:100:5"``, or ``"mean"`` for the run's mean; all frames if left out.
    on_skip : callable (frame, InputError), optional
        Told of a frame that cannot be read, which is then skipped; without it the error is raised.

    Raises
    ------
    InputError
        The session or the run cannot be used, or no frame could be read.
    """
    bench = Workbench(session)
    return list(measure_frames(bench, chosen_frames(bench, frames), on_skip=on_skip))


def chosen_frames(bench: Workbench, frames: str | Frame | Iterable[Frame] | None) -> list[Frame]:
    """The frames meant by a text, a number, or several of them."""
    if frames is None or isinstance(frames, str):
        return bench.frames(frames)
    chosen = [frames] if isinstance(frames, int) else list(frames)
    return [frame for entry in chosen for frame in bench.frames(str(entry))]


def measure_frames(
    bench: Workbench,
    frames: Iterable[Frame],
    *,
    on_skip: Callable[[Frame, InputError], None] | None = None,
    raise_if_none: bool = True,
) -> Iterator[dict]:
    """Rows of `measure`, one frame at a time, so that memory does not grow with their number.

    Where every frame was skipped the last error is raised, unless others go on with the rest of the run.
    """
    done, last_error = 0, None
    for frame in frames:
        try:
            row = frame_row(bench.session, frame, bench.field(frame))
        except UnreadableFrame as error:
            if on_skip is None or isinstance(frame, str):
                raise
            on_skip(frame, error)
            last_error = error
            continue
        done += 1
        yield row
    if last_error is not None and not done and raise_if_none:
        raise last_error


def measure_field(session: Session, field: Field) -> dict[str, RegionNumbers]:
    """The numbers of every region on one evaluated frame, by region name."""
    ready = prepare(field)
    return {
        region.name: measure_region(field, region.outline(), line=session.line, prepared=ready)
        for region in session.regions
    }


def frame_row(session: Session, frame: Frame, field: Field) -> dict:
    """One entry of the ``frames`` list."""
    numbers = measure_field(session, field)
    return {
        "frame": frame,
        "time": field.time,
        "regions": [region_row(region, numbers[region.name]) for region in session.regions],
    }


def region_row(region: Region, numbers: RegionNumbers) -> dict:
    """One region of one frame in the form of ``loopflux measure --format json``."""
    row = {
        "name": region.name,
        "shape": region.shape,
        "closed": numbers.closed,
        "length": _plain(numbers.length),
    }
    if numbers.area is not None:
        row["area"] = _plain(numbers.area)
    row["coverage"] = {key: share for key, share in numbers.coverage.items() if share is not None}
    budget = {}
    for key, attribute in NUMBERS.items():
        number = getattr(numbers, attribute)
        if number is not None:
            row[key] = number_row(number)
            budget[key] = [
                {
                    "part": part.name,
                    "kind": part.kind,
                    "sensitivity": part.sensitivity,
                    "uncertainty": part.uncertainty,
                }
                for part in number.budget
            ]
    if numbers.closure_circulation is not None:
        row["closure"] = {
            "circulation": number_row(numbers.closure_circulation),
            "flux": number_row(numbers.closure_flux),
        }
        row["index"] = numbers.index
    if numbers.resolution_gap:
        row["resolution_gap"] = dict(numbers.resolution_gap)
    if numbers.window_gap:
        row["window_gap"] = dict(numbers.window_gap)
    if numbers.inside:
        row["inside"] = {
            name: {key: number_row(number) for key, number in entry.items()}
            for name, entry in numbers.inside.items()
        }
    row["budget"] = budget
    row["warnings"] = list(numbers.warnings)
    if numbers.through_flow is not None:
        row["warnings"].append(CAUTION)
    return row


def number_row(number: Number) -> dict:
    """A number with its unit and standard uncertainties; parts that are not known are null."""
    return {
        "value": number.value,
        "unit": number.unit,
        "uncertainty": {
            "random": number.random,
            "systematic": number.systematic,
            "gaps": number.gaps,
            "combined": number.combined,
        },
    }


def region_named(session: Session, name: str) -> Region:
    """Raises InputError naming the regions there are."""
    found = next((region for region in session.regions if region.name == name), None)
    if found is None:
        known = ", ".join(region.name for region in session.regions) or "none"
        raise InputError(f'there is no region "{name}"; the regions are: {known}')
    return found


def unanswered(row: dict) -> list[str]:
    """Names of the regions of a frame's row of which a requested value is null."""
    return [
        region["name"]
        for region in row["regions"]
        if any(_is_null(region[key]) for key in NUMBERS if key in region)
    ]


def _is_null(number: dict) -> bool:
    return number["value"] is None


def _plain(number: Number) -> dict:
    return {"value": number.value, "unit": number.unit}
