"""Help for the panel in use, and what the program is."""

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QWidget

from fieldview.gui.help import HelpPage, topic_of
from fieldview.gui.help_pages import PAGES
from tests.gui.conftest import action, key


def test_every_page_can_be_shown(window):
    for topic in PAGES:
        page = HelpPage(window, topic)
        page.show()
        assert len(page.text.toPlainText()) > 100, topic
        page.close()


def test_f1_shows_the_page_of_the_panel_in_use(window):
    assert topic_of(window.regions.view) == "regions"
    assert topic_of(window.ledger.lines[0].switch) == "ledger"
    assert topic_of(None) == "canvas"
    key(window, Qt.Key.Key_F1)
    page = window.findChild(HelpPage)
    assert "Canvas" in page.windowTitle()
    page.close()


def test_every_panel_has_its_page(window):
    for name in ("canvas", "ledger", "quantities", "readout", "regions", "time_strip", "drawer"):
        assert window.findChild(QWidget, name) is not None
        assert name in PAGES


def test_about_names_the_versions(window):
    import numpy

    action(window, "help.about").trigger()
    assert numpy.__version__ in window.banner.text.text()
