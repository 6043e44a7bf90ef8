"""Loopflux: circulation, flux and their uncertainty from measured two-dimensional velocity fields."""

from __future__ import annotations

__version__ = "0.1.0"

_PUBLIC = {
    "load_session": "fieldview.session.store",
    "save_session": "fieldview.session.store",
    "evaluate": "fieldview.session.replay",
    "measure": "fieldview.session.measure",
    "quantity": "fieldview.compute.quantities",
    "InputError": "fieldview.compute.errors",
}
__all__ = sorted(_PUBLIC)


def __getattr__(name: str):
    # loaded on first use, so that importing the package stays quick and free of plotting and Qt
    if name in _PUBLIC:
        import importlib

        return getattr(importlib.import_module(_PUBLIC[name]), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")


def __dir__():
    return [*__all__, "__version__"]
