"""How a session was looked at, as it is kept under ``view`` in the session file."""

from __future__ import annotations

from fieldview.gui.picture import Shown

_KEPT = (
    "frame",
    "quantity",
    "iso_lines",
    "arrow_colour",
    "rejected_arrows",
    "coverage",
    "arrow_stretch",
    "units",
)


def view_from_shown(shown: Shown) -> dict:
    """What is worth keeping of how the session was looked at."""
    view = {name: getattr(shown, name) for name in _KEPT if getattr(shown, name) != getattr(Shown(), name)}
    if shown.levels:
        view["levels"] = {name: list(levels) for name, levels in sorted(shown.levels.items())}
    if shown.seeds:
        view["seeds"] = [[seed.real, seed.imag] for seed in shown.seeds]
    if shown.speed:
        view["speed"] = shown.speed
    return view


def shown_from_view(view: dict, before: Shown) -> Shown:
    """How a session is looked at first: as it was saved, else in the usual way; the tool stays in hand."""
    kinds = {name: type(getattr(Shown(), name)) for name in _KEPT}
    taken = {}
    for name, kind in kinds.items():
        value = view.get(name)
        if isinstance(value, kind if kind is not type(None) else str) or (
            kind is float and isinstance(value, int)
        ):
            taken[name] = value
    levels = view.get("levels")
    if isinstance(levels, dict):
        taken["levels"] = {
            str(name): (float(pair[0]), float(pair[1])) for name, pair in levels.items() if _is_pair(pair)
        }
    seeds = view.get("seeds")
    if isinstance(seeds, list):
        taken["seeds"] = tuple(complex(*pair) for pair in seeds if _is_pair(pair))
    if isinstance(view.get("speed"), int | float):
        taken["speed"] = float(view["speed"])
    return Shown(tool=before.tool, **taken)


def _is_pair(value) -> bool:
    return isinstance(value, list) and len(value) == 2 and all(isinstance(n, int | float) for n in value)
