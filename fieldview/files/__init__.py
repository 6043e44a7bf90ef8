"""Readers and writers, one module per format; a run as a lazy sequence of frames."""

from importlib import import_module

_HOME = {
    "Run": "run",
    "UnreadableFrame": "run",
    "open_run": "run",
    "expand": "sources",
    "peek": "peeking",
    "Peek": "peeking",
    "NeedsAnswer": "roles",
    "Question": "roles",
    "Reading": "reading",
}

__all__ = sorted(_HOME)


def __getattr__(name: str):
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"{__name__}.{_HOME[name]}"), name)
