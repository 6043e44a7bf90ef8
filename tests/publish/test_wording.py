"""Numbers as people read them."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fieldview.publish import wording

FINE = st.floats(min_value=1e-6, max_value=1e6)


@pytest.mark.parametrize(
    ("value", "uncertainty", "expected"),
    [
        # rounding to two digits of U, as JCGM 100:2008, 7.2.6 recommends
        (0.011304, 0.000251, "0.01130 ± 0.00025 m²/s"),
        (-0.0098, 0.000997, "−0.0098 ± 0.0010 m²/s"),
        (1234.6, 15.2, "1235 ± 15 m²/s"),
        (12346.0, 152.0, "12350 ± 150 m²/s"),
        (0.0, 0.00031, "0.00000 ± 0.00031 m²/s"),
    ],
)
def test_value_and_uncertainty_have_the_same_decimals(value, uncertainty, expected):
    assert wording.plus_minus(value, uncertainty, "m^2/s") == expected


def test_what_is_not_known_is_said():
    assert wording.plus_minus(0.0113, None, "m^2/s") == "0.01130 m²/s, U unknown"
    assert wording.plus_minus(None, None, "m^2/s") == "no value"


@given(value=FINE, share=st.floats(min_value=1e-4, max_value=1.0))
def test_rounding_never_moves_a_value_by_more_than_a_twentieth_of_its_uncertainty(value, share):
    uncertainty = value * share
    shown, _ = wording.pair(value, uncertainty)
    if "·" not in shown:
        assert abs(float(shown) - value) <= 0.0501 * uncertainty


def test_decimal_points_stand_in_one_line():
    texts = wording.aligned(["0.01130", "12.4", "150", "–"])
    places = [len(t) - t.index(".") for t in texts if "." in t]
    assert len(set(places)) == 1
    assert len(texts[0]) - len(texts[0].rstrip(wording.FIGURE_SPACE)) == 0
    assert texts[2].endswith(wording.POINT_SPACE + 5 * wording.FIGURE_SPACE)
    assert texts[3] == "–"


@pytest.mark.parametrize(
    ("share", "text"), [(1.0, "100 %"), (0.99999, "99.9 %"), (0.97, "97 %"), (0.0, "0 %"), (1e-6, "0.1 %")]
)
def test_a_share_just_below_one_never_reads_as_all(share, text):
    assert wording.percent(share) == text


def test_units_and_signs():
    assert wording.unit_text("m^2/s") == "m²/s"
    assert wording.with_unit("Q", "1") == "Q"
    assert wording.short(-0.25) == "−0.250"
    assert wording.is_noise(0.1, 0.2)
    assert not wording.is_noise(0.1, None)


@given(span=FINE, parts=st.integers(min_value=1, max_value=12))
def test_nice_steps_are_round_and_fit(span, parts):
    step = wording.nice_step(span, parts)
    assert f"{step:.3e}"[0] in "125" and f"{step:.3e}"[2:5] == "000"
    assert step >= 0.99 * span / parts
