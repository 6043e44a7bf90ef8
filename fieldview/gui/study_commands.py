"""The commands of the sheets on the whole run, of figures, of the report and of the run store."""

from __future__ import annotations

from pathlib import Path

from fieldview.gui import dialogs
from fieldview.gui.actions import Command, has_field, has_frames
from fieldview.gui.picture import Picture


def has_regions(picture: Picture) -> bool:
    return picture.field is not None and bool(picture.session.regions)


def has_file(picture: Picture) -> bool:
    return picture.path is not None and has_frames(picture)


def study_commands() -> tuple[Command, ...]:
    return (
        Command("study.check", "Run check …", "Measure", run_check, enabled=has_field, separated=True,
                hint="Is the run good? Shares, outliers, noise, jumps, stuck frames, drift"),
        Command("study.over_time", "Over time: spectrum and time scale …", "Measure", over_time,
                enabled=has_frames),
        Command("study.statistics", "Statistics over the run …", "Measure", statistics, enabled=has_frames),
        Command("study.correlation", "Two-point correlation …", "Measure", correlation, enabled=has_frames),
        Command("study.modes", "Modes of the run …", "Measure", modes, enabled=has_frames),
        Command("study.phase", "Phase averages …", "Measure", phase, enabled=has_frames),
        Command("study.compare", "Compare frames …", "Measure", compare, enabled=has_field),
        Command("study.repeats", "Repeats …", "Measure", repeats, enabled=has_regions),
        Command("study.choices", "How much is the analyst? …", "Measure", choices, enabled=has_regions),
    )  # fmt: skip


def hand_on_commands() -> tuple[Command, ...]:
    return (
        Command("output.figure", "Figure …", "Output", figure, "Ctrl+P", enabled=has_field, separated=True),
        Command("output.report", "Report …", "Output", report, enabled=has_field),
        Command("run.store", "Keep the run for quick scrubbing", "Output", store, enabled=has_file,
                separated=True,
                hint="One binary file beside the session; it is held against the sources at every opening"),
    )  # fmt: skip


def run_check(window) -> None:
    from fieldview.gui.studies.run_check import RunCheckSheet

    RunCheckSheet(window).show()


def over_time(window) -> None:
    from fieldview.gui.studies.over_time import OverTimeSheet

    OverTimeSheet(window).show()


def statistics(window) -> None:
    from fieldview.gui.studies.statistics import StatisticsSheet

    StatisticsSheet(window).show()


def correlation(window) -> None:
    from fieldview.gui.studies.statistics import CorrelationSheet

    CorrelationSheet(window).show()


def modes(window) -> None:
    from fieldview.gui.studies.modes import ModesSheet

    ModesSheet(window).show()


def phase(window) -> None:
    from fieldview.gui.studies.phase import PhaseSheet

    PhaseSheet(window).show()


def compare(window) -> None:
    from fieldview.gui.studies.comparison import ComparisonSheet

    ComparisonSheet(window).show()


def repeats(window) -> None:
    from fieldview.gui.studies.repeats import RepeatsSheet

    RepeatsSheet(window).show()


def choices(window) -> None:
    from fieldview.gui.studies.choices import ChoicesSheet

    ChoicesSheet(window).show()


def figure(window) -> None:
    from fieldview.gui.figure_sheet import FigureSheet

    FigureSheet(window).show()


def report(window) -> None:
    dialog = dialogs.saving(window, "Write the report", ("Report (*.html)",), "report.html")
    dialog.fileSelected.connect(lambda chosen: window.desk.report(Path(chosen).with_suffix(".html")))
    dialog.open()


def store(window) -> None:
    from fieldview.publish.storing import store_name

    path = window.desk.picture.path
    window.desk.store(path.parent / store_name(path))
