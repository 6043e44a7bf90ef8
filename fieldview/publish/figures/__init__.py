"""Publication figures: one function to draw, one to write, one for the caption. No display, no Qt."""

from importlib import import_module

_HOME = {
    "animate": "animation",
    "caption": "captions",
    "draw": "drawing",
    "make": "making",
    "picture": "saving",
    "save": "saving",
}

__all__ = sorted(_HOME)


def __getattr__(name: str):
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_HOME[name]}"), name)
