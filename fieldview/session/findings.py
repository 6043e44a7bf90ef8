"""Verdicts of the run check: plain sentences, each with the number behind it and the limit held against it.

The limits are common practice, without a source, and stand in every finding.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import asdict, dataclass

import numpy as np

from fieldview.compute.trends import FEWEST_FRAMES, drift, jumps
from fieldview.session.wording import figure

FINE, LOOK, SERIOUS, UNKNOWN = "fine", "look", "serious", "not known"

WELL_MEASURED = 0.9
"""Share of measured vectors a frame should have; below half of the nodes it is hardly a frame."""

OFTEN_REJECTED = 0.5
"""Share of frames in which a node is rejected, above which it is worth a mask."""

LOCKED = (0.1, 0.3)
"""Peak-locking index from which displacements are somewhat, and strongly locked."""

AGREEMENT = 1.5
"""Ratio of the largest to the smallest estimate of sigma up to which they agree."""

DIVERGENT = 1.5
"""Divergence over its expected noise from which there is more than noise in it."""

SAME_FRAME = 0.9
"""Share of unchanged vectors from which a frame is the one before once more."""

SAME_VECTOR = 0.5
"""Share of frames in which a vector does not change at all, from which it is stuck."""

STILL = 0.5
"""Standard deviation of a vector over the noise level, below which it is too quiet to be measured."""

FEWEST_STILL = 20
"""Samples from which a vector is called too quiet: of good ones fewer than one in a million would be."""

WAYS = {
    "stated": "stated",
    "neighbours": "from differences between neighbours",
    "frames": "from differences between frames",
    "divergence": "from the divergence",
}


@dataclass(frozen=True)
class Finding:
    """One item of the run check.

    Attributes
    ----------
    item : str
    verdict : str
        A plain sentence with its number in it.
    concern : "fine", "look", "serious" or "not known"
    value : float or None
        The number behind the verdict.
    unit : str
    uncertainty : float or None
        Standard, where there is one.
    limit : float or None
        What the value was held against.
    frames, nodes : tuple
        Frame numbers, or (iy, ix), to look at; the first hundred.
    """

    item: str
    verdict: str
    concern: str
    value: float | None
    unit: str = "1"
    uncertainty: float | None = None
    limit: float | None = None
    frames: tuple[int, ...] = ()
    nodes: tuple[tuple[int, int], ...] = ()

    def row(self) -> dict:
        row = asdict(self)
        return row | {"frames": list(self.frames), "nodes": [list(node) for node in self.nodes]}


_MOST_LISTED = 100


def findings(check) -> Iterator[Finding]:
    """Every item of a `RunCheck`, in the order of the panel."""
    yield _measured(check)
    yield _outliers(check)
    yield from _locking(check)
    yield _divergence(check)
    yield from _noise(check)
    yield _jumps(check)
    yield _stuck_frames(check)
    yield _stuck_vectors(check)
    yield from _drift(check)


def _measured(check) -> Finding:
    shares = np.array([look.share for look in check.frames])
    middle, worst = float(np.median(shares)), check.frames[int(shares.argmin())]
    few = tuple(look.frame for look in check.frames if look.share < WELL_MEASURED)
    concern = SERIOUS if shares.min() < 0.5 or check.skipped else LOOK if few else FINE
    words = f"{_percent(middle)} of the vectors are measured in a typical frame"
    if shares.size > 1:
        words += f"; the least are in frame {worst.frame}, {_percent(worst.share)}"
    if few:
        words += f"; {_some(len(few), 'frame')} below {_percent(WELL_MEASURED)}"
    if check.skipped:
        words += f"; {_some(len(check.skipped), 'frame')} could not be read"
    return Finding("share measured", words, concern, middle, limit=WELL_MEASURED, frames=few[:_MOST_LISTED])


def _outliers(check) -> Finding:
    rejected = sum(look.rejected for look in check.frames)
    nodes = sum(look.nodes for look in check.frames)
    share = rejected / nodes if nodes else 0.0
    often = np.nan_to_num(check.rejected) > OFTEN_REJECTED
    words = f"{_percent(share)} of the vectors are rejected"
    if rejected == 0:
        words = "no vector is rejected; a ledger without a test rejects none"
    if often.any():
        words += f"; {_some(int(often.sum()), 'node')} in more than half of the frames, worth a mask"
    concern = LOOK if often.any() or share > 1 - WELL_MEASURED else FINE
    return Finding("outliers", words, concern, share, limit=1 - WELL_MEASURED, nodes=_places(often))


def _locking(check) -> Iterator[Finding]:
    if not check.locking:
        words = "not looked at: the files hold no displacements in pixels"
        yield Finding("peak locking", words, UNKNOWN, None)
    for name, found in check.locking.items():
        item = f"peak locking of {name}"
        if not found.telling:
            words = (
                f"cannot be told: the displacements spread by only {figure(found.spread, 2)} px, "
                "less than half a pixel"
            )
            yield Finding(item, words, UNKNOWN, None, limit=LOCKED[0])
            continue
        size, (mild, strong) = abs(found.index), LOCKED
        where = "whole pixels" if found.index > 0 else "half pixels"
        words = f"the displacements do not gather at whole pixels (index {figure(found.index, 2)})"
        if size >= mild:
            how = "strongly" if size >= strong else "somewhat"
            words = f"the displacements gather {how} at {where} (index {figure(found.index, 2)})"
        concern = SERIOUS if size >= strong else LOOK if size >= mild else FINE
        yield Finding(item, words, concern, found.index, "1", _known(found.uncertainty), mild)


def _divergence(check) -> Finding:
    implied = check.sigma.get("divergence")
    item = "divergence"
    if implied is None:
        return Finding(
            item, "not looked at: it needs u and v at some thirty neighbouring nodes", UNKNOWN, None
        )
    level = f"{figure(implied['u'], 3)} {check.unit}"
    if check.divergence_ratio is None:
        words = f"it would be explained by a noise of {level}; no sigma is stated to hold it against"
        return Finding(item, words, UNKNOWN, implied["u"], check.unit)
    ratio = check.divergence_ratio
    words = (
        f"it is {figure(ratio, 3)} × what the stated sigma makes expect; a noise of {level} would explain it"
    )
    concern = FINE
    if ratio > DIVERGENT:
        words += ": sigma is too small, the flow is not planar, or it is not resolved by the grid"
        concern = LOOK
    elif ratio < 1 / DIVERGENT:
        words += ": sigma is too large, or the vectors are smoother than stated"
        concern = LOOK
    return Finding(item, words, concern, ratio, limit=DIVERGENT)


def _noise(check) -> Iterator[Finding]:
    for name in check.names:
        found = {way: levels[name] for way, levels in check.sigma.items() if name in levels}
        estimates = {way: level for way, level in found.items() if way != "stated"}
        item = f"noise of {name}"
        if not found:
            yield Finding(item, "cannot be told: too few neighbours and too few frames", UNKNOWN, None)
            continue
        listed = "; ".join(f"{figure(level, 3)} {WAYS[way]}" for way, level in found.items())
        words = f"sigma in {check.unit}: {listed}"
        if "frames" in found and not check.resolved[name]:
            words += " (an upper bound: the flow changes too fast from frame to frame)"
        if len(estimates) < 2:
            words += "; there are not two independent ways to compare"
            yield Finding(item, words, UNKNOWN, _first(found), check.unit)
            continue
        # an upper bound that is higher says nothing against the others
        firm = {w: v for w, v in found.items() if w != "frames" or check.resolved[name]}
        compared = firm if len(firm) > 1 else found
        ratio = max(compared.values()) / max(min(compared.values()), 1e-300)
        words += f"; the largest is {figure(ratio, 3)} × the smallest" + (
            ", so they agree" if ratio <= AGREEMENT else ", so they do not agree"
        )
        concern = FINE if ratio <= AGREEMENT else LOOK
        yield Finding(item, words, concern, _first(estimates), check.unit, limit=AGREEMENT)


def _first(levels: dict[str, float]) -> float:
    return next(iter(levels.values()))


def _jumps(check) -> Finding:
    found = set()
    if len(check.frames) < FEWEST_FRAMES:
        words = f"not looked at: it takes {FEWEST_FRAMES} frames to know what is usual"
        return Finding("jumps", words, UNKNOWN, None)
    for name in check.names:
        medians = np.array(
            [np.nan if look.median[name] is None else look.median[name] for look in check.frames]
        )
        found |= set(jumps(medians, floor=_floor(check, name)))
    found |= set(jumps(np.array([look.share for look in check.frames]), floor=0.05))
    frames = tuple(check.frames[int(place)].frame for place in sorted(found))
    words = "no frame differs from the one before by more than is usual in this run"
    if frames:
        words = f"{_some(len(frames), 'frame')} differ suddenly from the one before, first frame {frames[0]}"
    return Finding(
        "jumps", words, LOOK if frames else FINE, float(len(frames)), limit=0.0, frames=frames[:_MOST_LISTED]
    )


def _floor(check, name: str) -> float:
    """A change of the median that noise alone could make."""
    levels = [levels[name] for levels in check.sigma.values() if name in levels]
    nodes = max(1, int(np.median([look.measured for look in check.frames])))
    return 10 * max(levels, default=0.0) / np.sqrt(nodes)


def _stuck_frames(check) -> Finding:
    repeated = [(look.frame, look.repeated) for look in check.frames if look.repeated is not None]
    if not repeated:
        return Finding("stuck frames", "not looked at: it takes two frames", UNKNOWN, None)
    stuck = tuple(frame for frame, share in repeated if share >= SAME_FRAME)
    most = max(share for _, share in repeated)
    words = f"no frame repeats the one before; at most {_percent(most)} of the vectors are the same"
    if stuck:
        words = f"{_some(len(stuck), 'frame')} repeat the one before, first frame {stuck[0]}"
    concern = SERIOUS if stuck else FINE
    return Finding("stuck frames", words, concern, most, limit=SAME_FRAME, frames=stuck[:_MOST_LISTED])


def _stuck_vectors(check) -> Finding:
    item = "stuck vectors"
    enough = check.samples >= FEWEST_STILL
    same = (np.nan_to_num(check.repeats) > SAME_VECTOR) & (check.samples >= 3)
    levels = {name: _quietest(check, name) for name in check.names}
    quiet = np.zeros_like(enough)
    if all(level is not None for level in levels.values()):
        still = [check.deviation[name] < STILL * level for name, level in levels.items()]
        quiet = enough & np.logical_and.reduce(still)
    if not enough.any() and len(check.frames) < 3:
        return Finding(item, "not looked at: there are too few frames", UNKNOWN, None)
    stuck = same | quiet
    number = int(stuck.sum())
    words = "every vector moves as much as the noise makes it"
    if not enough.any():
        words = f"no vector repeats itself; whether one is too quiet takes {FEWEST_STILL} samples"
    elif any(level is None for level in levels.values()):
        words = "no vector repeats itself; whether one is too quiet cannot be told without a noise level"
    if number:
        words = (
            f"{_some(number, 'vector')} change less than half of the noise makes expect, or not at all: "
            "a reflection or a mark on the window, worth a mask"
        )
    return Finding(item, words, LOOK if number else FINE, float(number), limit=STILL, nodes=_places(stuck))


def _quietest(check, name: str) -> float | None:
    levels = [check.sigma[way][name] for way in ("neighbours", "frames") if name in check.sigma.get(way, {})]
    return min(levels) if levels else None


def _drift(check) -> Iterator[Finding]:
    for name in check.names:
        item = f"drift of {name}"
        medians = np.array(
            [np.nan if look.median[name] is None else look.median[name] for look in check.frames]
        )
        if np.isfinite(medians).sum() < FEWEST_FRAMES:
            yield Finding(item, f"not looked at: it takes {FEWEST_FRAMES} frames", UNKNOWN, None, check.unit)
            continue
        found = drift(medians)
        change = f"{figure(found.change, 2)} ± {figure(found.uncertainty, 2)} {check.unit} over the run"
        words = f"the median of {name} does not drift clearly: {change}"
        if found.clear:
            words = f"the median of {name} drifts by {change}"
        concern = LOOK if found.clear else FINE
        yield Finding(
            item, words, concern, found.change, check.unit, found.uncertainty, 2 * found.uncertainty
        )


# --- words -----------------------------------------------------------------------------------------


def _percent(share: float) -> str:
    return f"{figure(100 * share, 3)} %"


def _some(number: int, noun: str) -> str:
    return f"{number:,} {noun}" + ("" if number == 1 else "s")


def _places(nodes: np.ndarray) -> tuple[tuple[int, int], ...]:
    return tuple((int(iy), int(ix)) for iy, ix in np.argwhere(nodes)[:_MOST_LISTED])


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
