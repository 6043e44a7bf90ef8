"""Where the window keeps what it remembers: layout, recent runs, recovery files, samples."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import platformdirs

APPLICATION = "loopflux"
RECENT_MOST = 8


def config_folder() -> Path:
    return platformdirs.user_config_path(APPLICATION)


def state_folder() -> Path:
    return platformdirs.user_state_path(APPLICATION)


def remembered() -> dict:
    """What the window remembers from last time; nothing where the file is missing or spoilt."""
    try:
        found = json.loads((config_folder() / "window.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return {}
    return found if isinstance(found, dict) else {}


def remember(**changes) -> None:
    """Keep these for the next start. A folder that cannot be written to is no reason to complain."""
    from fieldview.session.store import write_whole

    kept = remembered() | changes
    try:
        config_folder().mkdir(parents=True, exist_ok=True)
        write_whole(config_folder() / "window.json", json.dumps(kept, indent=1).encode())
    except OSError:
        return


def recent() -> list[str]:
    """Paths of sessions and runs opened lately that are still there, newest first."""
    paths = remembered().get("recent", [])
    return [p for p in paths if isinstance(p, str) and Path(p).exists()] if isinstance(paths, list) else []


def add_recent(path: Path) -> None:
    """Put a path first among the recent ones."""
    entry = str(Path(path).absolute())
    others = [p for p in recent() if p != entry]
    remember(recent=[entry, *others][:RECENT_MOST])


def sample_session(name: str = "fin_wake") -> Path:
    """A sample session among the user's own things, where it can be saved; written on first use."""
    from fieldview.publish.samples import write_sample
    from fieldview.shipped import shipped_folder

    folder = platformdirs.user_data_path(APPLICATION) / "samples"
    target = folder / name / f"{name}.session.json"
    if not target.is_file():
        folder.mkdir(parents=True, exist_ok=True)
        shipped = shipped_folder("sample_sessions") / name
        if shipped.is_dir():
            shutil.copytree(shipped, folder / name, dirs_exist_ok=True)
        else:
            write_sample(name, folder)
    return target
