"""The text that goes below a figure: what is shown, how it was made, and how sure its numbers are."""

from __future__ import annotations

import fieldview
from fieldview.compute.field import Field, Status
from fieldview.compute.quantities import QUANTITIES
from fieldview.compute.region import prepare
from fieldview.compute.stencils import SCHEMES
from fieldview.publish import wording
from fieldview.publish.figures.arrows import arrows_of
from fieldview.publish.figures.panels import frame_words, panels_of
from fieldview.publish.figures.regions import number_of, number_text
from fieldview.session.figures import FigureSettings
from fieldview.session.ledger import sentence
from fieldview.session.replay import Workbench
from fieldview.session.store import session_digest

_CURVES = {
    "growth": "as the contour is scaled about its centroid; the band is the combined standard uncertainty",
    "around": "velocity along the contour and outward, against the way along it",
    "profile": "velocity along the line and to the right of it, against the way along it",
    "time": "frame by frame; the band is the random standard uncertainty of each",
    "spectrum": "one-sided power spectral density; the band holds 95 % for each value on its own",
    "convergence": "mean over the first n frames; the band is its standard uncertainty, by the time scale",
}


def caption(bench: Workbench, settings: FigureSettings) -> str:
    """One paragraph, ready to paste."""
    session = bench.session
    words = [f"{settings.title}." if settings.title else ""]
    words += _of_map(bench, settings) if settings.kind == "map" else [_of_curve(settings)]
    words.append(f"Run: {session.title}." if session.title else "")
    steps = [sentence(step) for step in session.ledger if step.on]
    words.append("Cleaning: " + "; ".join(steps) + "." if steps else "The vectors are as they were measured.")
    words.append(f"Derivatives: {SCHEMES[session.derivative].title.lower()}.")
    words.append(f"Loopflux {fieldview.__version__}, session {session_digest(session)}.")
    return " ".join(word for word in words if word) + "\n"


def _of_map(bench: Workbench, settings: FigureSettings) -> list[str]:
    panels = panels_of(bench, settings)
    units = bench.units
    names = ", ".join(
        f"{entry.title.lower()} {wording.with_unit(entry.symbol, entry.unit(units))}"
        for entry in (QUANTITIES[name] for name in settings.quantities)
    )
    frames = ", ".join(dict.fromkeys(frame_words(panel.frame, panel.field) for panel in panels))
    field = panels[0].field
    said = [f"{names[:1].upper()}{names[1:]}; {frames}.", _arrows(field, settings)]
    if settings.iso_lines in QUANTITIES:
        said.append(f"Lines: {QUANTITIES[settings.iso_lines].title.lower()}.")
    if settings.marks:
        said.append(_counts(field, len(panels) > 1))
    if settings.regions and settings.numbers and bench.session.regions:
        ready = prepare(field)
        numbers = "; ".join(
            f"{region.name} {number_text(number_of(region, field, ready, bench.session, settings))}"
            for region in bench.session.regions
        )
        which = f" ({frame_words(panels[0].frame, field)})" if len(panels) > 1 else ""
        said.append(f"Regions{which}: {numbers}.")
    said.append(uncertainty_statement(field))
    return said


def _of_curve(settings: FigureSettings) -> str:
    what = {"circulation": "Circulation", "flux": "Flux"}[settings.number]
    if settings.probe is not None:
        what = f"{QUANTITIES[settings.quantities[0]].title} at ({settings.probe[0]:g}, {settings.probe[1]:g})"
    elif settings.region is not None:
        what += f" of {settings.region}"
    if settings.kind in ("around", "profile"):
        what = settings.region or "A region"
    return f"{what}: {_CURVES[settings.kind]}."


def _arrows(field: Field, settings: FigureSettings) -> str:
    # how thin they are depends on the paper, so only that they are thinned is said
    if arrows_of(field, 1.0, settings) is None:
        return ""
    return f"Arrows: velocity, tail on its node, not closer than {settings.arrow_spacing_mm:g} mm."


def _counts(field: Field, several: bool) -> str:
    total = field.status.size
    again = int((field.once_rejected & (field.status == Status.FILLED)).sum())
    filled = f"filled ({again} of them after they were rejected)" if again else "filled"
    counts = {
        filled: field.count(Status.FILLED),
        "rejected": field.count(Status.REJECTED),
        "missing": field.count(Status.MISSING),
        "masked": field.count(Status.MASKED),
    }
    there = ", ".join(f"{number} {word}" for word, number in counts.items() if number)
    first = " in the first panel" if several else ""
    return f"Of {total} nodes{first} {there}." if there else f"All {total} nodes{first} are measured."


def uncertainty_statement(field: Field) -> str:
    """Where the uncertainties come from, in one sentence."""
    if field.error.sigma is None:
        return "No standard uncertainty of the vectors is known, so the numbers have no random part."
    how = {
        "given": "was stated",
        "from file": "is that of the file",
        "estimated": "was estimated from the run",
    }.get(field.error.origin, "is known")
    correlation = (
        "their correlation over neighbouring nodes taken into account"
        if field.error.correlation_stated
        else "errors of neighbouring nodes taken as independent, so that the random part is a lower bound"
    )
    return (
        f"Uncertainties are standard uncertainties (k = 1) of random, systematic and gap parts; the standard "
        f"uncertainty of a vector {how}, {correlation}."
    )
