"""Moments against the univariate sets of NIST's Statistical Reference Datasets (StRD).

NumAcc1 to NumAcc4 follow from their definitions, which are repeated here (from memory), and so do their
certified values: NumAcc1 mean 10000002, s 1, r1 -0.5; NumAcc2 mean 1.2, s 0.1, r1 -0.999; NumAcc3 mean
1000000.2, s 0.1, r1 -0.999; NumAcc4 mean 10000000.2, s 0.1, r1 -0.999. Tolerances are what doubles hold of
these numbers: an error of half a last digit of 1e7 in every value is 1e-8 of s.
"""

import math

import numpy as np
import pytest

from fieldview.compute.moments import Moments
from fieldview.compute.time_series import autocorrelation


def alternating(first: float, low: float, high: float) -> list[float]:
    """One value, then 500 pairs of two others."""
    return [first] + [low, high] * 500


MICHELSO = """
850 740 900 1070 930 850 950 980 980 880 1000 980 930 650 760 810 1000 1000 960 960 960 940 960 940 880
800 850 880 900 840 830 790 810 880 880 830 800 790 760 800 880 880 880 860 720 720 620 860 970 950 880
910 850 870 840 840 850 840 840 840 890 810 810 820 800 770 760 740 750 760 910 920 890 860 880 720 840
850 850 780 890 840 780 810 760 810 790 810 820 850 870 870 810 740 810 940 950 800 810 870
"""
"""Speed of light less 299 Mm/s. [km/s]"""

LEW = """
-213 -564 -35 -15 141 115 -420 -360 203 -338 -431 194 -220 -513 154 -125 -559 92 -21 -579 -52 99 -543
-175 162 -457 -346 204 -300 -474 164 -107 -572 -8 83 -541 -224 180 -420 -374 201 -236 -531 83 27 -564
-112 131 -507 -254 199 -311 -495 143 -46 -579 -90 136 -472 -338 202 -287 -477 169 -124 -568 17 48 -568
-135 162 -430 -422 172 -74 -577 -13 92 -534 -243 194 -355 -465 156 -81 -578 -64 139 -449 -384 193 -198
-538 110 -44 -577 -6 66 -552 -164 161 -460 -344 205 -281 -504 134 -28 -576 -118 156 -437 -381 200 -220
-540 83 11 -568 -160 172 -414 -408 188 -125 -572 -32 139 -492 -321 205 -262 -504 142 -83 -574 0 48 -571
-106 137 -501 -266 190 -391 -406 194 -186 -553 83 -13 -577 -49 103 -515 -280 201 300 -506 131 -45 -578
-80 138 -462 -361 201 -211 -554 32 74 -533 -235 187 -372 -442 182 -147 -566 25 68 -535 -244 194 -351 -463
174 -125 -570 15 72 -550 -190 172 -424 -385 198 -218 -536 96
"""


def numbers(text: str) -> np.ndarray:
    return np.array(text.split(), float)


SETS = {
    "NumAcc1": ([10000001.0, 10000003.0, 10000002.0], 10000002.0, 1.0, -0.5, 15, 12),
    "NumAcc2": (alternating(1.2, 1.1, 1.3), 1.2, 0.1, -0.999, 14, 12),
    "NumAcc3": (alternating(1000000.2, 1000000.1, 1000000.3), 1000000.2, 0.1, -0.999, 14, 9),
    "NumAcc4": (alternating(10000000.2, 10000000.1, 10000000.3), 10000000.2, 0.1, -0.999, 14, 8),
    "Michelso": (299 + numbers(MICHELSO) / 1000, 299.8524, 0.0790105478190518, 0.535199668621283, 14, 12),
    "Lew": (numbers(LEW), -177.435, 277.332168044316, -0.307304800605679, 14, 14),
}


def streamed(values, pieces=1) -> Moments:
    parts = []
    for chunk in np.array_split(np.asarray(values), pieces):
        parts.append(Moments(("x",)))
        for value in chunk:
            parts[-1].add({"x": np.asarray(value)})
    while len(parts) > 1:
        parts[0].merge(parts.pop())
    return parts[0]


@pytest.mark.parametrize("pieces", [1, 3])
@pytest.mark.parametrize("name", SETS)
def test_certified_mean_and_standard_deviation(name, pieces):
    values, mean, deviation, _, mean_digits, digits = SETS[name]
    found = streamed(values, pieces)
    assert abs(float(found.mean("x")) - mean) <= abs(mean) * 10.0**-mean_digits
    assert abs(float(found.deviation("x")) - deviation) <= deviation * 10.0**-digits


@pytest.mark.parametrize("name", SETS)
def test_certified_lag_one_autocorrelation(name):
    values, *_, r1, _, digits = SETS[name]
    found = autocorrelation(np.array(values), 1, biased=True).rho[1]
    assert -math.log10(max(abs(found / r1 - 1), 1e-16)) >= min(digits, 11)


def test_a_sum_of_squares_would_fail_where_this_does_not():
    """NumAcc4 is there for this: the textbook formula loses every digit of s."""
    x = np.array(SETS["NumAcc4"][0])
    square = (np.sum(x * x) - np.sum(x) ** 2 / x.size) / (x.size - 1)
    assert abs(np.sqrt(abs(square)) - 0.1) > 1e-4
