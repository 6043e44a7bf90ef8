"""Files that come with the program: drawings and sample sessions."""

from __future__ import annotations

import sys
import sysconfig
from pathlib import Path


def shipped_folder(name: str) -> Path:
    """Where ``icons`` or ``sample_sessions`` lie: beside the package in a checkout, else where installed."""
    beside = Path(__file__).resolve().parent.parent / name
    roots = (sysconfig.get_path("data"), sys.prefix)
    installed = [Path(root) / "share" / "loopflux" / name for root in roots]
    return next((folder for folder in (beside, *installed) if folder.is_dir()), beside)
