"""File dialogs and what follows from them. None of them blocks: the window goes on while one is open."""

from __future__ import annotations

from pathlib import Path

from PySide6.QtCore import Qt
from PySide6.QtGui import QGuiApplication, QImage, QPainter
from PySide6.QtWidgets import QFileDialog

RUN_FILES = (
    "Sessions and runs (*.json *.csv *.txt *.dat *.tsv *.nc *.h5 *.hdf5 *.npz *.mat *.gz)",
    "All files (*)",
)
FIELD_KINDS = {
    ".csv": "CSV",
    ".nc": "NetCDF",
    ".npz": "NumPy archive",
    ".h5": "HDF5",
    ".mat": "MATLAB container",
    ".vti": "VTK image data",
    ".vtr": "VTK rectilinear data",
}
FIELD_FILES = tuple(f"{title} (*{ending})" for ending, title in FIELD_KINDS.items())


def open_files(window) -> None:
    dialog = _dialog(window, "Open files or a session", QFileDialog.FileMode.ExistingFiles, RUN_FILES)
    dialog.filesSelected.connect(window.open)
    dialog.open()


def open_folder(window) -> None:
    dialog = _dialog(window, "Open a folder of frames", QFileDialog.FileMode.Directory, ())
    dialog.setOption(QFileDialog.Option.ShowDirsOnly)
    dialog.filesSelected.connect(window.open)
    dialog.open()


def save_as(window) -> None:
    session, path = window.desk.picture.session, window.desk.picture.path
    name = path.name if path else _stem(session.run.files[0]) + ".session.json"
    dialog = _dialog(window, "Save the session", QFileDialog.FileMode.AnyFile, ("Sessions (*.session.json)",))
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.setDirectory(str(path.parent if path else session.folder))
    dialog.selectFile(name)
    dialog.fileSelected.connect(lambda chosen: window.desk.save(_ending(Path(chosen), ".session.json")))
    dialog.open()


def export_field(window) -> None:
    """The field as the ledger leaves it, with the quantities that have a card."""
    picture = window.desk.picture
    dialog = _dialog(window, "Export the cleaned field", QFileDialog.FileMode.AnyFile, FIELD_FILES)
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.selectFile(f"{_stem(picture.session.run.files[0])}_{picture.shown.frame:05d}.csv")

    def write(chosen: str) -> None:
        endings = dict(zip(FIELD_FILES, FIELD_KINDS, strict=True))
        window.desk.export(_ending(Path(chosen), endings.get(dialog.selectedNameFilter(), ".csv"), endings))

    dialog.fileSelected.connect(write)
    dialog.open()


def export_picture(window) -> None:
    picture = window.desk.picture
    dialog = _dialog(window, "Save the canvas", QFileDialog.FileMode.AnyFile, ("Picture (*.png)",))
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.selectFile(f"{_stem(picture.session.run.files[0])}_{picture.shown.frame:05d}.png")
    dialog.fileSelected.connect(lambda chosen: save_picture(window, _ending(Path(chosen), ".png")))
    dialog.open()


def save_picture(window, path: Path, *, magnified: int = 2) -> None:
    """The canvas as it is, in twice the screen's pixels."""
    canvas = window.canvas
    image = QImage(canvas.viewport().size() * magnified, QImage.Format.Format_ARGB32_Premultiplied)
    image.setDevicePixelRatio(magnified)
    image.fill(canvas.backgroundBrush().color())
    with QPainter(image) as painter:
        painter.setRenderHint(QPainter.RenderHint.Antialiasing)
        canvas.render(painter)
    if image.save(str(path)):
        window.desk.tell(f"{path.name} was written to {path.parent}.")
    else:
        window.desk.complain(f"{path}: cannot be written; choose another place or another name.")


def table_text(window, separator: str) -> str:
    """The Regions table as text: titles, then a row for each region, numbers with a plain minus."""
    from fieldview.publish import wording

    model = window.regions.model
    lines = [separator.join(model.titles)]
    for row in model.rows:
        cells = [cell.text.strip().strip(wording.FIGURE_SPACE + wording.POINT_SPACE) for cell in row]
        lines.append(separator.join(cell.replace(wording.MINUS, "-") for cell in cells))
    return "\n".join(lines) + "\n"


def copy_regions(window) -> None:
    QGuiApplication.clipboard().setText(table_text(window, "\t"))
    window.desk.tell("The regions table is on the clipboard, ready to paste into a sheet.")


def saving(window, title: str, filters, name: str) -> QFileDialog:
    """A dialog for a file to be written, not yet open."""
    dialog = _dialog(window, title, QFileDialog.FileMode.AnyFile, filters)
    dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
    dialog.selectFile(name)
    return dialog


def export_regions(window) -> None:
    dialog = saving(window, "Export the regions table", ("CSV (*.csv)",), "regions.csv")
    dialog.fileSelected.connect(lambda chosen: write_regions(window, _ending(Path(chosen), ".csv")))
    dialog.open()


def write_regions(window, path: Path) -> None:
    """Every number of every region with its unit and uncertainty, one column each, unrounded."""
    from fieldview.gui.region_csv import regions_csv
    from fieldview.session.store import write_whole

    try:
        write_whole(path, regions_csv(window.desk.picture).encode())
    except OSError as error:
        window.desk.complain(f"{path}: cannot be written ({error.strerror}); choose another place.")
        return
    window.desk.tell(f"{path.name} was written to {path.parent}.")


def _dialog(window, title: str, mode: QFileDialog.FileMode, filters) -> QFileDialog:
    dialog = QFileDialog(window, title)
    dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
    dialog.setFileMode(mode)
    if filters:
        dialog.setNameFilters(list(filters))
    return dialog


def _stem(entry: str) -> str:
    name = Path(entry).name
    stem = name.split(".")[0].strip("*?[]0123456789_- ")
    return stem or Path(entry).parent.name or "run"


def _ending(path: Path, ending: str, known=None) -> Path:
    """The path with an ending the writers know."""
    endings = set(known.values()) if known else {ending}
    return path if any(path.name.lower().endswith(e) for e in endings) else path.with_name(path.name + ending)
