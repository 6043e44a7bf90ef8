"""The main window: panels around the canvas, actions over the desk."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import QByteArray, QEvent, QSize, Qt, QTimer
from PySide6.QtGui import QGuiApplication, QKeyEvent
from PySide6.QtWidgets import (
    QApplication,
    QHBoxLayout,
    QMainWindow,
    QStackedWidget,
    QToolBar,
    QVBoxLayout,
    QWidget,
)

from fieldview.gui import places, theme, work
from fieldview.gui.actions import Actions
from fieldview.gui.canvas.showing import Showing
from fieldview.gui.canvas.view import Canvas
from fieldview.gui.commands import all_commands
from fieldview.gui.desk import Desk
from fieldview.gui.icons import icon
from fieldview.gui.jobs import LATER
from fieldview.gui.panels.banner import Banner
from fieldview.gui.panels.drawer import Drawer
from fieldview.gui.panels.ledger import Ledger
from fieldview.gui.panels.quantities import Quantities
from fieldview.gui.panels.readout import Readout
from fieldview.gui.panels.regions import Regions
from fieldview.gui.panels.shared import Shared
from fieldview.gui.panels.start import Start
from fieldview.gui.panels.time_strip import TimeStrip
from fieldview.gui.recovery import Recovery, lost_sessions
from fieldview.gui.status_line import StatusLine
from fieldview.gui.style import style_sheet
from fieldview.gui.tools import TOOLS
from fieldview.gui.tools.picking import Pick
from fieldview.shipped import shipped_folder

WARM_UP_MS = 50
"""After the window is up, before the libraries that the first region needs are imported."""

WORKING_KEYS = (Qt.Key.Key_Return, Qt.Key.Key_Enter, Qt.Key.Key_Escape, Qt.Key.Key_Backspace)


class MainWindow(QMainWindow):
    """The window. Its state is the desk's picture; ``session`` and ``idle`` are for tests and tools."""

    def __init__(self):
        super().__init__()
        self.setObjectName("loopflux")
        self.setWindowTitle("Loopflux")
        self.setMinimumSize(900, 560)
        self.resize(1280, 720)
        self.setAcceptDrops(True)
        self.desk = Desk(self)
        self.recovery, self._lost = Recovery(), lost_sessions()
        self._kept = self._kept_saved = None
        self._asked = False
        self._picking: Pick | None = None
        self._waiting: list[Path] = []
        self._warm, self._warming = False, QTimer(self)
        self._warming.setSingleShot(True)
        self._warming.setInterval(WARM_UP_MS)
        self._warming.timeout.connect(self._warm_up)
        self.theme = theme.of_desktop()
        self.actions_table = Actions(self, all_commands())
        self._build()
        self.tools = {tool.id: tool.make(self.desk) for tool in TOOLS}
        self.desk.redrawn.connect(self._redraw)
        self.desk.questioned.connect(self.ask_reading)
        QGuiApplication.styleHints().colorSchemeChanged.connect(self._follow_desktop)
        self.set_theme(self.theme)
        self._restore()
        self._redraw()
        self._offer_lost()
        self.destroyed.connect(self.desk.jobs.close)

    def _warm_up(self) -> None:
        self.desk.jobs.submit("warm", work.warm_up, lane="warm", urgency=LATER)

    def showEvent(self, event):
        super().showEvent(event)
        if not self._warm:
            self._warm = True
            self._warming.start()

    # -- for tests and tools -------------------------------------------------------------------------

    @property
    def session(self):
        """The current session value, or None with an empty window."""
        return self.desk.picture.session

    @property
    def idle(self) -> bool:
        """True when no background work is pending."""
        return self.desk.idle

    def open(self, paths) -> None:
        """Open a session file or the files of a run; asks first where changes would be lost."""
        paths = [Path(path) for path in paths]
        if paths and self.desk.picture.unsaved:
            self._waiting = paths
            self.desk.complain(
                f"There are changes that are not saved; opening {paths[0].name} would drop them.",
                ("Save and open", "window.save_and_open"),
                ("Open without saving", "window.open_anyway"),
            )
            return
        self.desk.open(paths)

    # -- building ------------------------------------------------------------------------------------

    def _build(self):
        self.actions_table.fill(self.menuBar())
        self.canvas = Canvas()
        self.showing = Showing(self.canvas)
        self.ledger, self.quantities = Ledger(self.desk), Quantities(self.desk)
        self.readout, self.regions = Readout(self.desk), Regions(self.desk)
        self.time_strip, self.drawer = TimeStrip(self.desk), Drawer(self.desk)
        self._splitters: dict[str, Shared] = {}
        self._panels = (
            self.ledger,
            self.quantities,
            self.readout,
            self.regions,
            self.time_strip,
            self.drawer,
        )
        self.canvas.play_tapped.connect(self.time_strip.toggle_playing)
        self.tool_bar = self._tool_bar()
        self._pages = QStackedWidget()
        self.start = Start(self.actions_table.run, self.open)
        self._pages.addWidget(self.start)
        self._pages.addWidget(self._work_page())
        self.setCentralWidget(self._pages)
        self.banner = Banner(self.desk, self.actions_table.run, self._pages, self.canvas)
        self.status = StatusLine(self.desk)
        self.setStatusBar(self.status)
        self.actions_table.bind("canvas", self.canvas, self.time_strip)
        self.regions.view.setContextMenuPolicy(Qt.ContextMenuPolicy.ActionsContextMenu)
        for id, action in self.actions_table.items():
            if id.startswith("region."):
                self.regions.view.addAction(action)

    def _tool_bar(self) -> QToolBar:
        bar = QToolBar("Tools")
        bar.setObjectName("tools")
        bar.setOrientation(Qt.Orientation.Vertical)
        bar.setIconSize(QSize(20, 20))
        bar.setToolButtonStyle(Qt.ToolButtonStyle.ToolButtonIconOnly)
        for tool in TOOLS:
            action = self.actions_table[f"tool.{tool.id}"]
            bar.addAction(action)
            bar.widgetForAction(action).setFocusPolicy(Qt.FocusPolicy.TabFocus)
            bar.widgetForAction(action).setAccessibleName(f"{tool.title} tool")
        return bar

    def _work_page(self) -> QWidget:
        middle = QWidget()
        column = QVBoxLayout(middle)
        column.setContentsMargins(0, 0, 0, 0)
        column.setSpacing(0)
        row = QHBoxLayout()
        row.setSpacing(0)
        row.addWidget(self.tool_bar)
        row.addWidget(self.canvas, 1)
        column.addLayout(row, 1)
        column.addWidget(self.time_strip)
        across, down = Qt.Orientation.Horizontal, Qt.Orientation.Vertical
        right = Shared(down, {self.quantities: 0.62, self.readout: 0.38})
        top = Shared(across, {self.ledger: 0.19, middle: 0.6, right: 0.21}, stretches=middle)
        lower = Shared(across, {self.regions: 0.68, self.drawer: 0.32}, stretches=self.regions)
        whole = Shared(down, {top: 0.71, lower: 0.29}, stretches=top)
        self._splitters = {"right": right, "top": top, "lower": lower, "whole": whole}
        return whole

    # -- the one way back: a picture is drawn --------------------------------------------------------

    def _redraw(self):
        picture = self.desk.picture
        self._pages.setCurrentIndex(0 if picture.session is None else 1)
        self.canvas.tool = self._picking or self.tools[picture.shown.tool]
        self.showing.draw(picture)
        for panel in self._panels:
            panel.draw(picture)
        self.status.draw(picture)
        self.status.hint.setText(self.canvas.tool.hint if picture.session is not None else "")
        self.banner.draw(picture)
        self.actions_table.draw(picture)
        self.setWindowTitle(title_of(picture))
        self.setWindowModified(picture.unsaved)
        self._keep_changes(picture)

    def set_theme(self, new: theme.Theme) -> None:
        self.theme = new
        QApplication.instance().setPalette(theme.palette(new))
        self.setStyleSheet(style_sheet(new, (shipped_folder("icons") / "chevron.svg").as_posix()))
        self.setWindowIcon(icon("loopflux", new))
        self.actions_table.dress(lambda name: icon(name, new))
        for panel in self._panels:
            panel.set_theme(new)
        self.showing.set_theme(new)
        self._redraw()

    def _follow_desktop(self, *_):
        self.set_theme(theme.of_desktop())

    # -- the window itself ---------------------------------------------------------------------------

    def dragEnterEvent(self, event):
        if event.mimeData().hasUrls():
            event.acceptProposedAction()

    def dropEvent(self, event):
        paths = [url.toLocalFile() for url in event.mimeData().urls() if url.isLocalFile()]
        if paths:
            event.acceptProposedAction()
            self.open(paths)

    def keyPressEvent(self, event: QKeyEvent):
        # a drawing under way can be closed, shortened or dropped wherever the focus happens to be
        if event.key() in WORKING_KEYS and self.canvas.tool is not None and self.canvas.tool.busy:
            self.canvas.keyPressEvent(event)
        elif event.key() == Qt.Key.Key_Escape and self.desk.picture.notice is not None:
            self.desk.dismiss()
        else:
            super().keyPressEvent(event)

    def closeEvent(self, event):
        if self.isVisible() and self.desk.picture.unsaved and not self._asked:
            event.ignore()
            self._asked = True
            self.desk.complain(
                "There are changes that are not saved.",
                ("Save and close", "window.save_and_close"),
                ("Close without saving", "window.discard"),
            )
            return
        if self.desk.picture.unsaved:
            self.recovery.let_go()  # closed all the same: the next start offers the changes
        else:
            self.recovery.drop()
        places.remember(
            geometry=bytes(self.saveGeometry().toBase64()).decode(),
            splitters={name: s.sizes() for name, s in self._splitters.items() if s.settled}
            or places.remembered().get("splitters", {}),
        )
        self.time_strip.stop()
        self.desk.jobs.close()
        event.accept()

    def pick(self, count: int, hint: str, done) -> None:
        """Let so many places be clicked on the canvas, then call ``done`` with them; Esc gives up."""

        def picked(places) -> None:
            self._picking = None
            self._redraw()
            self.canvas.show_sketch(None)
            if places is not None:
                done(places)

        self._picking = Pick(self.desk, count, hint, picked)
        self.activateWindow()
        self.canvas.setFocus()
        self._redraw()

    def ask_reading(self) -> None:
        """Open the reading sheet for what could not be opened, or for the run that is open."""
        picture = self.desk.picture
        if self.desk.opening is not None:
            session, path = self.desk.opening
            why = picture.notice.text if picture.notice is not None else ""
        elif picture.run is not None:
            session, path, why = picture.session, picture.path, ""
        else:
            return
        from fieldview.gui.reading_sheet import ReadingSheet

        ReadingSheet(self, session, path, why).show()

    def save_and_close(self) -> None:
        """Save, then close once the file is written."""
        self.desk.after_saving = self.close
        self.actions_table.run("session.save")

    def save_and_open(self) -> None:
        """Save, then open what was asked for."""
        self.desk.after_saving = self.open_anyway
        self.actions_table.run("session.save")

    def open_anyway(self) -> None:
        """Open what was asked for, whatever becomes of the changes."""
        paths, self._waiting = self._waiting, []
        self.desk.open(paths)

    def discard(self) -> None:
        """Close and forget the changes."""
        self.desk.update(saved=self.session)
        self.close()

    def recover(self) -> None:
        """Take up what an earlier program left; it counts as not saved."""
        if self._lost:
            lost = self._lost.pop(0)
            self.desk.adopt(lost.session, lost.path, saved=False)
            self.recovery.keep(lost.session, lost.path)
            lost.file.unlink(missing_ok=True)
            self._offer_lost()

    def forget_lost(self) -> None:
        """Give up what an earlier program left."""
        if self._lost:
            self._lost.pop(0).file.unlink(missing_ok=True)
            self.desk.dismiss()
            self._offer_lost()

    def _offer_lost(self):
        if self._lost and self.session is None:
            self.desk.complain(
                self._lost[0].sentence, ("Recover", "recovery.take"), ("Discard", "recovery.drop")
            )

    def _keep_changes(self, picture):
        """Every edit goes to the recovery file; a saved session needs none."""
        if picture.history is self._kept and picture.saved is self._kept_saved:
            return
        self._kept, self._kept_saved = picture.history, picture.saved
        self._asked = False
        if picture.unsaved:
            self.recovery.keep(picture.session, picture.path)
        else:
            self.recovery.drop()

    def find_command(self) -> None:
        """Open the command finder."""
        from fieldview.gui.finder import Finder

        Finder(self.actions_table, self).open()

    def changeEvent(self, event):
        if event.type() == QEvent.Type.WindowTitleChange:
            self.setAccessibleName(self.windowTitle())
        super().changeEvent(event)

    def _restore(self):
        kept = places.remembered()
        if isinstance(kept.get("geometry"), str):
            self.restoreGeometry(QByteArray.fromBase64(kept["geometry"].encode()))
        sizes = kept.get("splitters")
        for name, splitter in self._splitters.items():
            wanted = sizes.get(name) if isinstance(sizes, dict) else None
            if isinstance(wanted, list) and len(wanted) == splitter.count() and all(n > 0 for n in wanted):
                splitter.wish([int(n) for n in wanted])
        self.start.show_recent(places.recent())


def title_of(picture) -> str:
    if picture.session is None:
        return "Loopflux"
    name = picture.path.name if picture.path else picture.session.run.files[0]
    return f"{name}[*] — Loopflux"
