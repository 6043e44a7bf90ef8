"""Quantities: a card for each, with a small map, its range and how far it stands above its uncertainty."""

from __future__ import annotations

from functools import lru_cache

from PySide6.QtCore import QAbstractListModel, QModelIndex, QRect, QSize, Qt
from PySide6.QtGui import QColor, QImage, QPainter, QPen
from PySide6.QtWidgets import QComboBox, QHBoxLayout, QListView, QStyle, QStyledItemDelegate, QToolButton

from fieldview.gui import theme as themes
from fieldview.gui.canvas.map_image import map_image
from fieldview.gui.panels.base import Panel, label
from fieldview.gui.picture import Card, Picture
from fieldview.gui.pursuit import levels_of_values
from fieldview.gui.theme import Theme
from fieldview.publish import wording
from fieldview.publish.units_shown import UnitView

FIRST = ("speed", "vorticity", "divergence")
SCHEME_WORDS = {
    "central": "central differences",
    "richardson": "Richardson, 4th order",
    "least_squares": "least squares, 5 points",
    "circulation": "circulation, 8 neighbours",
}
CARD = Qt.ItemDataRole.UserRole


class CardModel(QAbstractListModel):
    def __init__(self, parent=None):
        super().__init__(parent)
        self.cards: tuple[Card, ...] = ()
        self.known_names: tuple[str, ...] = ()

    def put(self, cards: tuple[Card, ...]) -> None:
        names = tuple(card.name for card in cards)
        if names != self.known_names:
            self.beginResetModel()
            self.cards, self.known_names = cards, names
            self.endResetModel()
        elif any(a is not b for a, b in zip(cards, self.cards, strict=True)):
            self.cards = cards
            self.dataChanged.emit(self.index(0), self.index(len(cards) - 1))

    def rowCount(self, parent=None):
        return 0 if parent is not None and parent.isValid() else len(self.cards)

    def data(self, index: QModelIndex, role=Qt.ItemDataRole.DisplayRole):
        if not index.isValid() or index.row() >= len(self.cards):
            return None
        card = self.cards[index.row()]
        match role:
            case Qt.ItemDataRole.DisplayRole:
                return card.title
            case Qt.ItemDataRole.AccessibleTextRole:
                return f"{card.title}, {range_text(card)} {wording.unit_text(card.unit)}, {times_text(card)}"
            case Qt.ItemDataRole.ToolTipRole:
                lines = (
                    f"{card.title} {wording.with_unit(card.symbol, card.unit)}",
                    times_text(card),
                    card.reason,
                )
                return "\n".join(line for line in lines if line)
        return card if role == CARD else None


class CardPainter(QStyledItemDelegate):
    """Draws one card: 56 pixels high, map on the left, three lines of text beside it."""

    HEIGHT = 58

    def __init__(self, panel):
        super().__init__(panel)
        self._panel = panel
        self._images: dict[str, tuple[Card, Theme, QImage]] = {}

    def sizeHint(self, option, index):
        return QSize(150, self.HEIGHT)

    def paint(self, painter: QPainter, option, index):
        card, theme = index.data(CARD), self._panel.theme
        box = option.rect.adjusted(1, 1, -1, -1)
        shown = card.name == self._panel.shown_name
        painter.save()
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        if shown:
            painter.setBrush(QColor(theme.canvas))
            painter.setPen(QPen(QColor(theme.accent), 1.2))
            painter.drawRoundedRect(box, 3, 3)
        elif option.state & QStyle.StateFlag.State_HasFocus:
            painter.setPen(QPen(QColor(theme.accent), 1, Qt.PenStyle.DotLine))
            painter.drawRoundedRect(box, 3, 3)
        else:
            painter.setPen(QColor(theme.hairline))
            painter.drawLine(box.bottomLeft(), box.bottomRight())
        picture = QRect(box.left() + 5, box.top() + 6, 72, box.height() - 12)
        self._draw_map(painter, picture, card, theme)
        self._draw_words(painter, box.adjusted(84, 3, -4, -3), card, theme)
        painter.restore()

    def _draw_map(self, painter, box, card, theme):
        held = self._images.get(card.name)
        if held is None or held[0] is not card or held[1] is not theme:
            held = (card, theme, thumbnail_image(card, theme))
            self._images[card.name] = held
        size = held[2].size().scaled(box.size(), Qt.AspectRatioMode.KeepAspectRatio)
        target = QRect(box.topLeft(), size)
        target.moveCenter(box.center())
        painter.drawImage(target, held[2].flipped(Qt.Orientation.Vertical))

    def _draw_words(self, painter, box, card, theme):
        stale = card.of is not self._panel.field
        left = Qt.AlignmentFlag.AlignLeft | Qt.AlignmentFlag.AlignVCenter
        line = QRect(box.left(), box.top(), box.width(), 18)
        bold = themes.font(bold=True)
        painter.setFont(bold)
        painter.setPen(QColor(theme.text))
        painter.drawText(line, left, card.symbol)
        taken = painter.fontMetrics().horizontalAdvance(card.symbol) + 6
        painter.setFont(themes.font())
        factor, unit = self._panel.unit_view.of(card.unit)
        room = line.adjusted(taken, 0, 0, 0)
        unit_width = painter.fontMetrics().horizontalAdvance(unit) + 6
        title = painter.fontMetrics().elidedText(
            card.title, Qt.TextElideMode.ElideRight, max(20, room.width() - unit_width)
        )
        painter.drawText(room, left, title)
        painter.setFont(themes.font(pixels=themes.SMALL_PIXELS))
        painter.setPen(QColor(theme.muted))
        painter.drawText(line, Qt.AlignmentFlag.AlignRight | Qt.AlignmentFlag.AlignVCenter, unit)
        line.translate(0, 17)
        painter.setFont(themes.font())
        painter.setPen(QColor(theme.muted if stale else theme.text))
        painter.drawText(line, left, range_text(card, factor))
        line.translate(0, 16)
        painter.setFont(themes.font(pixels=themes.SMALL_PIXELS))
        painter.setPen(QColor(theme.muted))
        painter.drawText(line, left, times_text(card))


class Quantities(Panel):
    def __init__(self, desk, parent=None):
        super().__init__(desk, "quantities", "Quantities", parent)
        self.shown_name, self.field, self.unit_view = "", None, UnitView()
        self.scheme = QComboBox()
        self.scheme.setAccessibleName("Derivative scheme")
        for name, words in SCHEME_WORDS.items():
            self.scheme.addItem(words, name)
        self.scheme.activated.connect(
            lambda place: desk.edit("Change the derivative scheme", derivative=self.scheme.itemData(place))
        )
        self.column.addWidget(self.scheme)
        self.gain = label("", "muted", wrap=True)
        self.column.addWidget(self.gain)
        self.column.addLayout(self._buttons())
        self.model = CardModel(self)
        self.view = QListView()
        self.view.setObjectName("quantity_cards")
        self.view.setAccessibleName("Quantities of the field")
        self.view.setModel(self.model)
        self.view.setItemDelegate(CardPainter(self))
        self.view.setMouseTracking(True)
        self.view.setVerticalScrollMode(QListView.ScrollMode.ScrollPerPixel)
        self.view.setHorizontalScrollBarPolicy(Qt.ScrollBarPolicy.ScrollBarAlwaysOff)
        self.view.clicked.connect(lambda index: desk.show(quantity=index.data(CARD).name))
        self.view.activated.connect(lambda index: desk.show(quantity=index.data(CARD).name))
        self.column.addWidget(self.view, 1)

    def _buttons(self) -> QHBoxLayout:
        row = QHBoxLayout()
        row.setSpacing(4)
        self.iso, self.tint = QToolButton(), QToolButton()
        for button, text, tip, key in (
            (self.iso, "Iso-lines", "Draw the chosen card's quantity as iso-lines", "iso_lines"),
            (self.tint, "Arrow colour", "Colour the arrows by the chosen card's quantity", "arrow_colour"),
        ):
            button.setText(text)
            button.setToolTip(tip)
            button.setCheckable(True)
            button.setProperty("role", "plain")
            button.clicked.connect(lambda on, key=key: self._toggle(key, on))
            row.addWidget(button)
        row.addStretch()
        return row

    def _toggle(self, key: str, on: bool) -> None:
        index = self.view.currentIndex()
        name = index.data(CARD).name if index.isValid() else self.desk.picture.shown.quantity
        self.desk.show(**{key: name if on else None})

    def draw(self, picture: Picture) -> None:
        shown = picture.shown
        wanted = (shown.quantity, picture.field, picture.unit_view)
        redraw = wanted != (self.shown_name, self.field, self.unit_view)
        self.shown_name, self.field, self.unit_view = wanted
        self.model.put(in_order(picture.cards))
        self.iso.setChecked(shown.iso_lines is not None)
        self.tint.setChecked(shown.arrow_colour is not None)
        self.iso.setToolTip(_tip("iso-lines", shown.iso_lines))
        self.tint.setToolTip(_tip("arrow colour", shown.arrow_colour))
        if picture.session is not None:
            place = self.scheme.findData(picture.session.derivative)
            if place != self.scheme.currentIndex():
                self.scheme.setCurrentIndex(place)
        self.scheme.setEnabled(picture.session is not None)
        self.gain.setText(gain_text(picture))
        if redraw:
            self.view.viewport().update()


def in_order(cards) -> tuple[Card, ...]:
    """Magnitude, vorticity and divergence first, then the rest as the list of quantities has them."""
    from fieldview.compute.quantities import QUANTITIES

    names = [*FIRST, *(name for name in QUANTITIES if name not in FIRST)]
    return tuple(cards[name] for name in names if name in cards)


def gain_text(picture: Picture) -> str:
    """What noise becomes in the vorticity under the scheme in use."""
    if picture.session is None or picture.field is None or not picture.field.in_plane:
        return ""
    error = picture.field.error
    gain = _gain(picture.session.derivative, error.correlation)
    bound = "" if error.correlation_stated else " (independent errors assumed)"
    return f"noise gain of ω {gain:.2f} σ/Δ{bound}"


@lru_cache(maxsize=64)
def _gain(scheme: str, correlation: tuple[float, float]) -> float:
    from fieldview.compute.derivatives import noise_gain

    return noise_gain(scheme, correlation=correlation)


def range_text(card: Card, factor: float = 1.0) -> str:
    """``−38.7 … +39.2``, times a factor for the units shown."""
    if card.low is None:
        return "no values"
    low, high = (wording.short(factor * end, signed=card.kind != "unsigned") for end in (card.low, card.high))
    return f"{low} … {high}"


def times_text(card: Card) -> str:
    if card.times_u is not None:
        return f"{wording.short(card.times_u, digits=2)} × its U"
    return "U unknown"


def thumbnail_image(card: Card, theme: Theme) -> QImage:
    import numpy as np

    from fieldview.compute.grid import Grid

    low, high = levels_of_values(card.thumbnail, card.kind)
    ny, nx = card.thumbnail.shape
    grid = Grid(np.arange(nx, dtype=float), np.arange(ny, dtype=float))
    return map_image(card.thumbnail, grid, themes.colour_table(theme, card.kind), low, high).image


def _tip(what: str, name: str | None) -> str:
    return f"Shown as {what}: {name.replace('_', ' ')}" if name else f"Show the chosen card as {what}"
