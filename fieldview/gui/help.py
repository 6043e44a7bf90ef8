"""Finding commands, help on the panels, and what this program is."""

from __future__ import annotations

from fieldview.gui.actions import Command


def help_commands() -> tuple[Command, ...]:
    return (
        Command("help.find", "Find a command …", "Help", lambda w: w.find_command(), "Ctrl+K", "search"),
        Command("help.about", "About Loopflux", "Help", about, separated=True),
    )


def about(window) -> None:
    """Versions of the program and of the libraries its numbers come from."""
    from importlib.metadata import version

    import fieldview

    libraries = ("numpy", "scipy", "shapely", "contourpy", "PySide6-Essentials", "pyqtgraph")
    versions = ", ".join(f"{name} {version(name)}" for name in libraries)
    window.desk.tell(
        f"Loopflux {fieldview.__version__}: circulation, flux and their uncertainty from measured velocity "
        f"fields. Computed with {versions}. BSD 3-Clause licence."
    )
