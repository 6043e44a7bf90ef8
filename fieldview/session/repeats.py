"""Repeats of the same measurement: does the scatter of a number agree with its stated uncertainty?

Mean, standard deviation and standard uncertainty of the mean are Type A evaluations (JCGM 100:2008, 4.2). The
Birge ratio sets the scatter against the stated random uncertainties (Birge 1932, Phys. Rev. 40:207-227, from
memory): near one they are honest, well above they are too small or the flow was not the same.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from fieldview.compute.errors import InputError
from fieldview.session.measure import NUMBERS

FEWEST = 3
_UNLIKELY = 0.01


@dataclass(frozen=True)
class Repeat:
    """One number of one region over the repeats.

    Attributes
    ----------
    region, number, unit : str
    values : tuple of float
    stated : tuple of float, or None
        Random standard uncertainty of each; None where one is not known.
    without : int
        Repeats without a value.
    """

    region: str
    number: str
    unit: str
    values: tuple[float, ...]
    stated: tuple[float, ...] | None
    without: int

    @property
    def deviation(self) -> float:
        """Experimental standard deviation."""
        return float(np.std(self.values, ddof=1))

    @property
    def birge_ratio(self) -> float | None:
        """Root of chi squared over the degrees of freedom, about the weighted mean."""
        if self.stated is None or not all(spread > 0 for spread in self.stated):
            return None
        values, weights = np.array(self.values), 1 / np.array(self.stated) ** 2
        mean = (weights * values).sum() / weights.sum()
        return float(np.sqrt((weights * (values - mean) ** 2).sum() / (len(values) - 1)))

    def chances(self) -> tuple[float, float] | None:
        """Probability that honest uncertainties give a ratio this small or smaller, this large or larger."""
        from scipy.stats import chi2

        ratio, freedom = self.birge_ratio, len(self.values) - 1
        if ratio is None:
            return None
        return float(chi2.cdf(freedom * ratio**2, freedom)), float(chi2.sf(freedom * ratio**2, freedom))

    def verdict(self) -> str:
        chances = self.chances()
        if chances is None:
            return "no random uncertainty is stated, so the scatter is all there is"
        count, (small, large) = len(self.values), chances
        if large < _UNLIKELY:
            return (
                f"scatters more than stated (by chance {large:.2g}): the stated random uncertainty is too "
                "small, or the flow was not the same each time"
            )
        if small < _UNLIKELY:
            return f"scatters less than stated (by chance {small:.2g}): the stated random part is too large"
        return f"{count} repeats scatter as stated"

    def row(self) -> dict:
        """In strict JSON."""
        count = len(self.values)
        return {
            "region": self.region,
            "number": self.number,
            "unit": self.unit,
            "repeats": count,
            "without_value": self.without,
            "mean": float(np.mean(self.values)),
            "deviation": self.deviation,
            "mean_uncertainty": self.deviation / count**0.5,
            "stated": None if self.stated is None else float(np.sqrt(np.mean(np.square(self.stated)))),
            "birge_ratio": self.birge_ratio,
            "verdict": self.verdict(),
        }


def repeats(measured: Mapping[str, Mapping]) -> list[Repeat]:
    """Numbers of the regions that all repeats have, from one frame's row of `measure` for each.

    Raises
    ------
    InputError
        Fewer than three repeats, or no region in common.
    """
    if len(measured) < FEWEST:
        raise InputError(f"{len(measured)} repeats say too little; give at least {FEWEST}")
    rows = [{region["name"]: region for region in frame["regions"]} for frame in measured.values()]
    common = [name for name in rows[0] if all(name in row for row in rows)]
    if not common:
        raise InputError("the sessions have no region of the same name; give the regions the same names")
    found = []
    for name in common:
        for number in NUMBERS:
            if all(number in row[name] for row in rows):
                repeat = _repeat(name, number, [row[name][number] for row in rows])
                if repeat is not None:
                    found.append(repeat)
    return found


def _repeat(region: str, number: str, entries: list[dict]) -> Repeat | None:
    units = {entry["unit"] for entry in entries}
    if len(units) > 1:
        raise InputError(f"{number} of {region} comes in {' and '.join(sorted(units))}; calibrate all alike")
    known = [entry for entry in entries if entry["value"] is not None]
    if len(known) < FEWEST:
        return None
    spreads = [entry["uncertainty"]["random"] for entry in known]
    return Repeat(
        region,
        number,
        units.pop(),
        tuple(entry["value"] for entry in known),
        None if None in spreads else tuple(spreads),
        len(entries) - len(known),
    )
