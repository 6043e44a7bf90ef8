"""The window's style sheet, filled with a theme's colours."""

from __future__ import annotations

from fieldview.gui.theme import FONT_PIXELS, SMALL_PIXELS, Theme


def style_sheet(theme: Theme, chevron: str) -> str:
    """The style sheet; ``chevron`` is the path of the drawing for combo boxes."""
    return _SHEET.format(
        **{
            name: getattr(theme, name)
            for name in Theme.__dataclass_fields__
            if not name.endswith(("_part", "_map"))
        },
        px=FONT_PIXELS,
        small=SMALL_PIXELS,
        chevron=chevron,
    )


_SHEET = """
QWidget {{ color: {text}; font-size: {px}px; }}
QMainWindow, QStatusBar, QMenuBar {{ background: {panel}; }}
QMenuBar {{ border-bottom: 1px solid {hairline}; padding: 1px 4px; }}
QMenuBar::item {{ padding: 3px 8px; background: transparent; border-radius: 3px; }}
QMenuBar::item:selected {{ background: {chosen}; }}
QMenu {{ background: {panel}; border: 1px solid {hairline}; padding: 4px; }}
QMenu::item {{ padding: 4px 24px 4px 24px; border-radius: 3px; }}
QMenu::item:selected {{ background: {chosen}; color: {text}; }}
QMenu::item:disabled {{ color: {muted}; }}
QMenu::separator {{ height: 1px; background: {hairline}; margin: 4px 8px; }}
QMenu::icon {{ padding-left: 6px; }}
QStatusBar {{ border-top: 1px solid {hairline}; }}
QStatusBar::item {{ border: none; }}
QStatusBar QLabel {{ color: {muted}; font-size: {small}px; padding: 0 8px; }}
QSplitter::handle {{ background: {hairline}; }}
QLabel[role="heading"] {{ color: {accent}; font-weight: bold; }}
QLabel[role="muted"] {{ color: {muted}; font-size: {small}px; }}
QLabel[role="attention"] {{ color: {attention}; font-weight: 600; }}
QLabel[role="history"] {{ color: {filled}; font-size: {small}px; }}
QLabel[role="title"] {{ font-size: 20px; font-weight: bold; }}
QWidget[role="panel"], QScrollArea[role="panel"] {{ background: {panel}; }}
QWidget[role="paper"] {{ background: {canvas}; }}
QFrame[role="mark line"] {{ background: {accent}; border: none; }}
QLabel[role="mark words"] {{ color: {accent}; font-size: {small}px; }}
QFrame[role="rule"] {{ background: {hairline}; border: none; }}
QFrame[role="banner"] {{
    background: {panel}; border: 1px solid {attention}; border-left: 4px solid {attention};
    border-radius: 3px;
}}
QFrame[role="ledger line"] {{
    border: none; border-bottom: 1px solid {hairline}; background: transparent;
}}
QFrame[role="ledger line"][chosen="true"] {{ background: {chosen}; }}
QToolBar {{
    background: {canvas}; border: none; border-right: 1px solid {hairline}; spacing: 2px;
    padding: 4px 3px;
}}
QToolBar QToolButton {{ border: none; border-radius: 4px; padding: 4px; }}
QToolBar QToolButton:hover {{ background: {chosen}; }}
QToolBar QToolButton:checked {{ background: {accent}; }}
QToolBar QToolButton:focus {{ border: 1px solid {accent}; padding: 3px; }}
QPushButton, QToolButton[role="plain"] {{
    background: {entry}; border: 1px solid {hairline}; border-radius: 3px; padding: 2px 9px;
    min-height: 17px;
}}
QToolButton[role="plain"] {{ padding: 2px 6px; }}
QPushButton:hover, QToolButton[role="plain"]:hover {{ border-color: {accent}; }}
QPushButton:focus, QToolButton[role="plain"]:focus {{ border: 1px solid {accent}; }}
QPushButton:checked, QPushButton:default, QToolButton[role="plain"]:checked {{
    background: {accent}; color: {on_accent}; border-color: {accent};
}}
QPushButton:disabled {{ color: {muted}; background: {panel}; }}
QToolButton[role="plain"]::menu-indicator {{ image: none; }}
QLineEdit, QSpinBox, QDoubleSpinBox, QComboBox, QPlainTextEdit {{
    background: {entry}; border: 1px solid {hairline}; border-radius: 3px; padding: 2px 5px;
    min-height: 18px; selection-background-color: {accent}; selection-color: {on_accent};
}}
QLineEdit:focus, QSpinBox:focus, QDoubleSpinBox:focus, QComboBox:focus, QPlainTextEdit:focus {{
    border-color: {accent};
}}
QLineEdit[wrong="true"] {{ border-color: {attention}; }}
QComboBox::drop-down {{ border: none; width: 18px; }}
QComboBox::down-arrow {{ image: url("{chevron}"); width: 12px; height: 12px; }}
QComboBox QAbstractItemView {{
    background: {panel}; border: 1px solid {hairline}; selection-background-color: {chosen};
    selection-color: {text};
}}
QAbstractItemView {{ background: {panel}; border: none; outline: none; }}
QListWidget::item:selected {{ background: {chosen}; color: {text}; }}
QTableView {{
    gridline-color: transparent; selection-background-color: {chosen}; selection-color: {text};
}}
QTableView[role="paper"] {{ background: {canvas}; }}
QHeaderView {{ background: transparent; }}
QHeaderView::section {{
    background: transparent; color: {muted}; border: none; border-bottom: 1px solid {hairline};
    padding: 3px 8px; font-size: {small}px;
}}
QTabBar::tab {{
    background: transparent; border: none; border-bottom: 2px solid transparent; padding: 4px 7px;
    color: {muted};
}}
QTabBar::tab:selected {{ color: {text}; border-bottom: 2px solid {accent}; }}
QTabBar::tab:focus {{ color: {accent}; }}
QScrollBar:vertical {{ background: transparent; width: 10px; margin: 0; }}
QScrollBar:horizontal {{ background: transparent; height: 10px; margin: 0; }}
QScrollBar::handle {{
    background: {hairline}; border-radius: 4px; min-height: 24px; min-width: 24px; margin: 1px;
}}
QScrollBar::handle:hover {{ background: {muted}; }}
QScrollBar::add-line, QScrollBar::sub-line {{ width: 0; height: 0; }}
QScrollBar::add-page, QScrollBar::sub-page {{ background: transparent; }}
QProgressBar {{
    background: {hairline}; border: none; border-radius: 2px; max-height: 4px; min-height: 4px;
}}
QProgressBar::chunk {{ background: {accent}; border-radius: 2px; }}
QToolTip {{ background: {panel}; color: {text}; border: 1px solid {hairline}; padding: 3px; }}
"""
