"""What the commands do."""

from __future__ import annotations

from pathlib import Path

from fieldview.gui import dialogs
from fieldview.gui.actions import Command, has_field, has_frames, has_selection, has_session
from fieldview.gui.panels.quantities import FIRST
from fieldview.gui.picture import Picture
from fieldview.gui.tools import TOOLS
from fieldview.publish.looks import COLOUR_WORDS, REGION_COLOURS
from fieldview.publish.units_shown import CHOICES

OTHER_SAMPLES = (
    ("stirred_tank", "one vortex, in pixels with a calibration"),
    ("hood_face", "flow through an opening"),
)


def run_commands() -> tuple[Command, ...]:
    return (
        Command("session.open", "&Open …", "Run", dialogs.open_files, "Ctrl+O", "open"),
        Command("session.open_folder", "Open &folder …", "Run", dialogs.open_folder),
        Command("session.sample", "Try a sample", "Run", lambda w: w.desk.open_sample("fin_wake")),
        *(
            Command(
                f"session.sample.{name}",
                f"Sample: {words}",
                "Run",
                lambda w, name=name: w.desk.open_sample(name),
                group="Other samples",
            )
            for name, words in OTHER_SAMPLES
        ),
        Command(
            "sheet.reading",
            "How the files are read …",
            "Run",
            lambda w: w.ask_reading(),
            enabled=lambda p: p.session is not None or p.notice is not None,
        ),
        Command("session.save", "&Save", "Run", save, "Ctrl+S", "save", has_session, separated=True),
        Command("session.save_as", "Save &as …", "Run", dialogs.save_as, "Ctrl+Shift+S", enabled=has_session),
        Command("window.save_and_close", "Save and close", "", lambda w: w.save_and_close()),
        Command("window.save_and_open", "Save and open", "", lambda w: w.save_and_open()),
        Command("window.open_anyway", "Open without saving", "", lambda w: w.open_anyway()),
        Command("window.discard", "Close without saving", "", lambda w: w.discard()),
        Command("recovery.take", "Recover", "", lambda w: w.recover()),
        Command("recovery.drop", "Discard", "", lambda w: w.forget_lost()),
        Command("window.close", "&Quit", "Run", lambda w: w.close(), "Ctrl+Q", separated=True),
    )


def edit_commands() -> tuple[Command, ...]:
    return (
        Command(
            "edit.undo",
            "Undo",
            "Edit",
            lambda w: w.desk.undo(),
            "Ctrl+Z",
            "undo",
            lambda p: p.history is not None and p.history.undo_name is not None,
            text=lambda p: _named("Undo", p.history and p.history.undo_name),
        ),
        Command(
            "edit.redo",
            "Redo",
            "Edit",
            lambda w: w.desk.redo(),
            "Ctrl+Shift+Z | Ctrl+Y",
            "redo",
            lambda p: p.history is not None and p.history.redo_name is not None,
            text=lambda p: _named("Redo", p.history and p.history.redo_name),
        ),
        Command(
            "region.duplicate",
            "Duplicate region",
            "Edit",
            duplicate_region,
            "Ctrl+D",
            enabled=has_selection,
            separated=True,
        ),
        Command(
            "region.delete",
            "Delete region",
            "Edit",
            delete_region,
            "Del",
            "remove",
            has_selection,
            scope="canvas",
        ),
        *(
            Command(
                f"region.colour.{word.replace(' ', '_')}",
                f"Colour {word}",
                "Edit",
                lambda w, colour=colour: colour_region(w, colour),
                enabled=has_selection,
                group="Region colour",
            )
            for word, colour in zip(COLOUR_WORDS, REGION_COLOURS, strict=True)
        ),
        Command("region.up", "Move region up", "Edit", lambda w: move_region(w, -1), enabled=has_selection),
        Command(
            "region.down", "Move region down", "Edit", lambda w: move_region(w, 1), enabled=has_selection
        ),
    )


def view_commands() -> tuple[Command, ...]:
    return (
        Command("view.fit", "&Fit", "View", lambda w: w.canvas.fit(), "F", "fit", has_field),
        Command("view.zoom_in", "Zoom in", "View", lambda w: w.canvas.zoom(1.25), "Ctrl++ | Ctrl+="),
        Command("view.zoom_out", "Zoom out", "View", lambda w: w.canvas.zoom(0.8), "Ctrl+-"),
        *_quantity_commands(),
        Command(
            "view.fit_colours",
            "Fit colour range to this frame",
            "View",
            fit_colours,
            enabled=has_field,
            separated=True,
            hint="The range is locked from frame to frame until you ask",
        ),
        Command("view.colour_range", "Colour range …", "View", colour_range,
                enabled=lambda p: p.map is not None),
        Command(
            "view.fit_arrows", "Fit arrow length to this frame", "View", fit_arrows, enabled=has_field
        ),
        Command(
            "view.longer_arrows", "Longer arrows", "View", lambda w: stretch(w, 1.25), "Ctrl+Up"
        ),
        Command(
            "view.shorter_arrows", "Shorter arrows", "View", lambda w: stretch(w, 0.8), "Ctrl+Down"
        ),
        Command(
            "view.rejected_arrows",
            "Show rejected vectors",
            "View",
            lambda w: w.desk.show(rejected_arrows=not w.desk.picture.shown.rejected_arrows),
            checked=lambda p: p.shown.rejected_arrows,
            enabled=has_field,
        ),
        Command("view.clear_seeds", "Clear streamlines", "View", lambda w: w.desk.show(seeds=()),
                enabled=lambda p: bool(p.shown.seeds)),
        Command("frame.previous", "Previous frame", "View", lambda w: step(w, -1), "Left", "previous",
                has_frames, scope="canvas", separated=True),
        Command("frame.next", "Next frame", "View", lambda w: step(w, 1), "Right", "next", has_frames,
                scope="canvas"),
        Command("frame.first", "First frame", "View", lambda w: w.desk.go_to(0), "Home", enabled=has_frames,
                scope="canvas"),
        Command("frame.last", "Last frame", "View", lambda w: w.desk.go_to(10**9), "End", enabled=has_frames,
                scope="canvas"),
        Command("frame.play", "Play", "View", play, "", "play", has_frames),
    )  # fmt: skip


def unit_commands() -> tuple[Command, ...]:
    return tuple(
        Command(
            f"units.{choice}",
            words.capitalize(),
            "View",
            lambda w, choice=choice: w.desk.show(units=choice),
            enabled=has_session,
            checked=lambda p, choice=choice: p.shown.units == choice,
            group="Show numbers",
            hint="Needs a reference length and velocity" if choice == "reference" else "",
        )
        for choice, words in CHOICES
    )


def measure_commands() -> tuple[Command, ...]:
    made = [
        Command(
            f"tool.{tool.id}",
            tool.title,
            "Measure",
            lambda w, id=tool.id: w.desk.show(tool=id),
            tool.key,
            tool.id,
            checked=lambda p, id=tool.id: p.shown.tool == id,
            hint=tool.make.hint,
        )
        for tool in TOOLS
    ]
    line = Command(
        "line.cubic",
        "Cubic line along contours",
        "Measure",
        toggle_line,
        enabled=has_session,
        checked=lambda p: p.session is not None and p.session.line == "cubic",
        separated=True,
        hint="For cores of few nodes: less bias, slightly more noise than the bilinear line",
    )
    follow = Command("measure.follow", "Follow regions over the run", "Measure", lambda w: w.desk.follow(),
                     enabled=has_frames)  # fmt: skip
    sheets = (
        Command("sheet.uncertainty", "Uncertainty …", "Measure", uncertainty, enabled=has_session,
                separated=True),
        Command("sheet.calibration", "Calibration and axes …", "Measure", calibration, enabled=has_session),
        Command("sheet.reference", "Reference values …", "Measure", reference, enabled=has_session),
    )  # fmt: skip
    return (*made, line, follow, *sheets)


def output_commands() -> tuple[Command, ...]:
    return (
        Command("export.field", "Export the cleaned field …", "Output", dialogs.export_field, "Ctrl+E",
                "export", has_field),
        Command("export.picture", "Save the canvas as a picture …", "Output", dialogs.export_picture, "",
                "picture", has_field),
        Command("regions.copy", "Copy the regions table", "Output", dialogs.copy_regions, "Ctrl+Shift+C",
                enabled=has_session),
        Command("regions.export", "Export the regions table …", "Output", dialogs.export_regions,
                enabled=has_session),
    )  # fmt: skip


def all_commands() -> tuple[Command, ...]:
    from fieldview.gui.help import help_commands
    from fieldview.gui.study_commands import hand_on_commands, study_commands

    return (
        *run_commands(),
        *edit_commands(),
        *view_commands(),
        *unit_commands(),
        *measure_commands(),
        *study_commands(),
        *output_commands(),
        *hand_on_commands(),
        *help_commands(),
    )


def save(window) -> None:
    """Save where the session came from; ask for a place the first time."""
    path = window.desk.picture.path
    if path is None:
        dialogs.save_as(window)
    else:
        window.desk.save(Path(path))


def step(window, by: int) -> None:
    window.desk.go_to(window.desk.picture.shown.frame + by)


def stretch(window, factor: float) -> None:
    before = window.desk.picture.shown.arrow_stretch
    window.desk.show(arrow_stretch=min(max(before * factor, 0.2), 8.0))


def fit_colours(window) -> None:
    from fieldview.gui.pursuit import levels_of

    picture = window.desk.picture
    if picture.map is not None:
        window.desk.show(levels={**picture.shown.levels, picture.map.name: levels_of(picture.map)})


def fit_arrows(window) -> None:
    from fieldview.gui.canvas.arrows import typical_speed
    from fieldview.gui.pursuit import reference_speed

    window.desk.show(speed=reference_speed(typical_speed(window.desk.picture.field)), arrow_stretch=1.0)


def toggle_line(window) -> None:
    cubic = window.desk.picture.session.line == "cubic"
    window.desk.edit("Change the line along contours", line="bilinear" if cubic else "cubic")


def delete_region(window) -> None:
    picture = window.desk.picture
    name = picture.shown.selected
    regions = tuple(r for r in picture.session.regions if r.name != name)
    window.desk.edit(f"Delete {name}", regions=regions)


def colour_region(window, colour: str) -> None:
    region = window.desk.picture.selected
    changed = region.model_copy(update={"colour": colour})
    window.desk.change_region(region.name, changed, f"Colour {region.name}")


def duplicate_region(window) -> None:
    from fieldview.gui.shaping import moved

    desk = window.desk
    region = desk.picture.selected
    off = 12 / window.canvas.lens().scale
    copy = moved(region, complex(off, -off))
    name = desk.free_name(region.name.rstrip("0123456789 ") or "region")
    desk.add_region(copy.model_copy(update={"name": name, "colour": None}))


def move_region(window, by: int) -> None:
    picture = window.desk.picture
    regions = list(picture.session.regions)
    place = next(i for i, r in enumerate(regions) if r.name == picture.shown.selected)
    target = min(max(place + by, 0), len(regions) - 1)
    regions.insert(target, regions.pop(place))
    window.desk.edit(f"Move {picture.shown.selected}", regions=tuple(regions))


def _named(word: str, name: str | None) -> str:
    return f"{word} {name[:1].lower()}{name[1:]}" if name else word


def _quantity_commands() -> list[Command]:
    from fieldview.compute.quantities import QUANTITIES

    names = [*FIRST, *(name for name in QUANTITIES if name not in FIRST)]
    return [
        Command(
            f"map.{name}",
            f"{QUANTITIES[name].title} {QUANTITIES[name].symbol}",
            "View",
            lambda w, name=name: w.desk.show(quantity=name),
            str(number + 1) if number < 3 else "",
            enabled=lambda p, name=name: _has(p, name),
            checked=lambda p, name=name: p.shown.quantity == name,
            group="Map of",
        )
        for number, name in enumerate(names)
        if name in QUANTITIES
    ]


def _has(picture: Picture, name: str) -> bool:
    from fieldview.compute.quantities import QUANTITIES

    return picture.field is not None and all(
        need in picture.field.components for need in QUANTITIES[name].needs
    )


def play(window) -> None:
    window.time_strip.toggle_playing()


def colour_range(window) -> None:
    from fieldview.gui.colour_sheet import ColourSheet

    ColourSheet(window).show()


def uncertainty(window) -> None:
    from fieldview.gui.uncertainty_sheet import UncertaintySheet

    UncertaintySheet(window).show()


def calibration(window) -> None:
    from fieldview.gui.calibration_sheet import CalibrationSheet

    CalibrationSheet(window).show()


def reference(window) -> None:
    from fieldview.gui.reference_sheet import ReferenceSheet

    ReferenceSheet(window).show()
