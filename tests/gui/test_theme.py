"""Colours read well, in the light and in the dark."""

import numpy as np
import pytest

from fieldview.gui import theme
from fieldview.gui.icons import drawing
from fieldview.gui.theme import DARK, LIGHT
from fieldview.gui.tools import TOOLS
from fieldview.shipped import shipped_folder


@pytest.mark.parametrize("shown", [LIGHT, DARK], ids=["light", "dark"])
def test_text_contrasts_with_its_ground(shown):
    """4.5 to 1 is the least that WCAG 2.1 (success criterion 1.4.3) asks for."""
    for ground in (shown.canvas, shown.panel, shown.chosen):
        for colour in (shown.text, shown.muted, shown.accent, shown.attention, shown.filled):
            assert theme.contrast(colour, ground) >= 4.5, (colour, ground)
    assert theme.contrast(shown.on_accent, shown.accent) >= 4.5


@pytest.mark.parametrize("shown", [LIGHT, DARK], ids=["light", "dark"])
def test_region_colours_are_made_legible(shown, qapp):
    for colour in theme.REGION_COLOURS:
        assert theme.contrast(theme.legible(colour, shown), shown.canvas) >= 4.5


def test_contrast_against_known_values():
    """Black on white is 21 to 1 and a colour on itself 1 to 1 (WCAG 2.1, definition of contrast ratio)."""
    assert theme.contrast("#000000", "#ffffff") == pytest.approx(21.0)
    assert theme.contrast("#0b6e69", "#0b6e69") == pytest.approx(1.0)


@pytest.mark.parametrize("shown", [LIGHT, DARK], ids=["light", "dark"])
def test_signed_maps_are_balanced_about_their_middle(shown, qapp):
    table = theme.colour_table(shown, "signed").astype(float)
    brightness = table @ [0.2126, 0.7152, 0.0722]
    assert abs(brightness[0] - brightness[-1]) < 60
    middle = brightness[128]
    assert (middle > brightness[[0, -1]]).all() if not shown.dark else (middle < brightness[[0, -1]]).all()
    assert np.ptp(table[128]) < 40, "no hue of its own at zero"


def test_neighbouring_regions_differ_in_colour_and_dash():
    colours = [theme.region_colour(None, place) for place in range(6)]
    dashes = [theme.region_dash(place) for place in range(6)]
    assert len(set(colours)) == len(set(dashes)) == 6


def test_every_tool_has_its_own_drawing(qapp):
    pictures = {}
    for tool in TOOLS:
        assert (shipped_folder("icons") / f"{tool.id}.svg").is_file(), tool.id
        image = drawing(tool.id, "#000000", 24).toImage()
        pictures[tool.id] = bytes(image.constBits())
        assert any(pictures[tool.id]), f"{tool.id} draws nothing"
    assert len(set(pictures.values())) == len(TOOLS)
