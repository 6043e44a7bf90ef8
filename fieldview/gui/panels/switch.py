"""A check box drawn as a switch."""

from __future__ import annotations

from PySide6.QtCore import QRectF, QSize, Qt
from PySide6.QtGui import QColor, QPainter, QPalette, QPen
from PySide6.QtWidgets import QCheckBox


class Switch(QCheckBox):
    """On: filled, knob to the right; off: outline only, knob to the left. Never the colour alone."""

    def sizeHint(self):
        return QSize(30, 18)

    def minimumSizeHint(self):
        return self.sizeHint()

    def hitButton(self, position):
        return self.rect().contains(position)

    def paintEvent(self, event):
        colours = self.palette()
        with QPainter(self) as painter:
            painter.setRenderHint(QPainter.RenderHint.Antialiasing)
            track = QRectF(2.5, 3.5, 22, 12)
            accent = colours.color(QPalette.ColorRole.Highlight)
            quiet = colours.color(QPalette.ColorRole.PlaceholderText)
            painter.setPen(QPen(accent if self.isChecked() else quiet, 1))
            painter.setBrush(accent if self.isChecked() else Qt.BrushStyle.NoBrush)
            painter.drawRoundedRect(track, 6, 6)
            painter.setBrush(
                colours.color(QPalette.ColorRole.HighlightedText) if self.isChecked() else QColor(quiet)
            )
            painter.setPen(Qt.PenStyle.NoPen)
            x = track.right() - 10 if self.isChecked() else track.left() + 2
            painter.drawEllipse(QRectF(x, track.top() + 2, 8, 8))
            if self.hasFocus():
                painter.setBrush(Qt.BrushStyle.NoBrush)
                painter.setPen(QPen(accent, 1, Qt.PenStyle.DotLine))
                painter.drawRoundedRect(QRectF(0.5, 1.5, 26, 16), 8, 8)
