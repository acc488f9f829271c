"""What the window asks the reader: which file, and what becomes of unsaved changes.

Every question is asked without stopping the event loop, and answered to a callback.
"""

from __future__ import annotations

from collections.abc import Callable
from enum import StrEnum
from pathlib import Path

from PySide6.QtCore import QStandardPaths, Qt
from PySide6.QtWidgets import QFileDialog, QMessageBox, QWidget

__all__ = ["Choice", "Dialogs", "documents"]

BOOK_FILTER = "Book workbooks (*.xlsx *.xlsm);;All files (*)"


class Choice(StrEnum):
    """What becomes of unsaved changes."""

    SAVE = "save"
    DISCARD = "discard"
    CANCEL = "cancel"


def documents() -> Path:
    """The folder where a reader keeps documents."""
    found = QStandardPaths.writableLocation(QStandardPaths.StandardLocation.DocumentsLocation)
    return Path(found) if found else Path.home()


class Dialogs:
    """The questions, as windows over a parent."""

    def __init__(self, parent: QWidget) -> None:
        self._parent = parent

    def ask_unsaved(self, name: str, before: str, on_choice: Callable[[Choice], None]) -> None:
        """What becomes of the unsaved changes to `name`, `before` something happens to them."""
        box = QMessageBox(self._parent)
        box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        box.setWindowModality(Qt.WindowModality.WindowModal)
        box.setIcon(QMessageBox.Icon.NoIcon)
        box.setWindowTitle("Unsaved changes")
        box.setText(f"Save the changes to “{name}” {before}?")
        box.setInformativeText("Changes that are not saved are lost.")
        buttons = QMessageBox.StandardButton
        box.setStandardButtons(buttons.Save | buttons.Discard | buttons.Cancel)
        box.setDefaultButton(buttons.Save)
        box.setEscapeButton(buttons.Cancel)
        choices = {buttons.Save: Choice.SAVE, buttons.Discard: Choice.DISCARD}

        def answered(_result: int) -> None:
            pressed = box.clickedButton()
            standard = box.standardButton(pressed) if pressed is not None else buttons.Cancel
            on_choice(choices.get(standard, Choice.CANCEL))

        box.finished.connect(answered)
        box.open()

    def ask_overwrite(self, question: str, why: str, on_yes: Callable[[], None]) -> None:
        """Whether a file may be replaced, where there is more to say than that it exists."""
        box = QMessageBox(self._parent)
        box.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        box.setWindowModality(Qt.WindowModality.WindowModal)
        box.setIcon(QMessageBox.Icon.NoIcon)
        box.setWindowTitle("Replace the file?")
        box.setText(question)
        box.setInformativeText(why)
        replace = box.addButton("Replace", QMessageBox.ButtonRole.DestructiveRole)
        keep = box.addButton(QMessageBox.StandardButton.Cancel)
        box.setDefaultButton(keep)

        def answered(_result: int) -> None:
            if box.clickedButton() is replace:
                on_yes()

        box.finished.connect(answered)
        box.open()

    def ask_open(self, folder: Path, on_path: Callable[[Path], None]) -> None:
        """Which workbook to open."""
        dialog = QFileDialog(self._parent, "Open a book", str(folder), BOOK_FILTER)
        dialog.setFileMode(QFileDialog.FileMode.ExistingFile)
        self._ask(dialog, on_path)

    def ask_save(self, title: str, suggestion: Path, on_path: Callable[[Path], None]) -> None:
        """Where to write a workbook; a file that exists is asked about."""
        dialog = QFileDialog(self._parent, title, str(suggestion.parent), "Workbooks (*.xlsx)")
        dialog.setAcceptMode(QFileDialog.AcceptMode.AcceptSave)
        dialog.setDefaultSuffix("xlsx")
        dialog.selectFile(suggestion.name)
        self._ask(dialog, on_path)

    def _ask(self, dialog: QFileDialog, on_path: Callable[[Path], None]) -> None:
        dialog.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        dialog.fileSelected.connect(lambda text: on_path(Path(text)))
        dialog.open()
