"""A fault of the program itself: logged, shown once, and never at the cost of the open book."""

from __future__ import annotations

import faulthandler
import logging
import platform
import sys
import threading
import traceback
from collections.abc import Callable
from logging.handlers import RotatingFileHandler
from pathlib import Path
from types import TracebackType
from typing import IO

from PySide6 import __version__ as pyside_version
from PySide6.QtCore import (
    QMessageLogContext,
    QObject,
    QStandardPaths,
    Qt,
    QtMsgType,
    Signal,
    qInstallMessageHandler,
    qVersion,
)
from PySide6.QtGui import QFontDatabase, QGuiApplication
from PySide6.QtWidgets import (
    QDialog,
    QHBoxLayout,
    QLabel,
    QPlainTextEdit,
    QPushButton,
    QVBoxLayout,
    QWidget,
)

from desk import __version__
from desk.window.parts.theme import GAP, HALF, WIDE, keep_look

__all__ = ["ErrorDialog", "ErrorKeeper", "log_folder", "start_log", "versions"]

_log = logging.getLogger(__name__)

_LOG_BYTES = 1_000_000
_LOG_FILES = 3
_MOST_SHOWN = 20


def versions() -> str:
    """The versions that matter, one a line."""
    import numpy

    return "\n".join(
        (
            f"Gapwright {__version__}",
            f"Python {platform.python_version()}",
            f"Qt {qVersion()}, PySide6 {pyside_version}",
            f"numpy {numpy.__version__}",
            f"{platform.system()} {platform.release()} {platform.machine()}",
        )
    )


def log_folder() -> Path:
    """Where the log is."""
    return Path(QStandardPaths.writableLocation(QStandardPaths.StandardLocation.StateLocation))


def start_log(folder: Path | None = None) -> Path | None:
    """Log to a file that is turned over at a megabyte; None where there is no place for it.

    Parameters
    ----------
    folder : Path, optional
        By default `log_folder`.
    """
    folder = folder or log_folder()
    path = folder / "gapwright.log"
    try:
        folder.mkdir(parents=True, exist_ok=True)
        handler = RotatingFileHandler(path, maxBytes=_LOG_BYTES, backupCount=_LOG_FILES, encoding="utf-8")
    except OSError as error:
        # The program works without a log; whoever started it from a terminal is told.
        _log.warning("no log is kept: %s", error)
        return None
    handler.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(name)s: %(message)s"))
    logging.getLogger().addHandler(handler)
    logging.getLogger("desk").setLevel(logging.INFO)
    return path


class ErrorDialog(QDialog):
    """Explains that the program has a fault, that the book is safe, and what can be done.

    Attributes
    ----------
    save_button, copy_button, close_button : QPushButton
    """

    def __init__(
        self,
        parent: QWidget | None,
        *,
        save_copy: Callable[[], None] | None,
        log_path: Path | None,
    ) -> None:
        super().__init__(parent)
        self.setWindowTitle("Something went wrong in Gapwright")
        self.setAttribute(Qt.WidgetAttribute.WA_DeleteOnClose)
        self._details: list[str] = []
        what = QLabel("Gapwright met a fault of its own")
        keep_look(what, "title")
        kept = "Your book is still open and nothing in it was lost. " if save_copy is not None else ""
        told = QLabel(
            f"{kept}What you did last may not have been carried out. You can go on working; to be on the "
            "safe "
            "side, save a copy of the book first. The details below help to find the cause: they name "
            "places in "
            "the program, and may hold figures or names of your book."
            if save_copy is not None
            else "What you did last may not have been carried out. You can go on working. The details below "
            "help to find the cause."
        )
        told.setWordWrap(True)
        self.text = QPlainTextEdit()
        self.text.setReadOnly(True)
        self.text.setFont(QFontDatabase.systemFont(QFontDatabase.SystemFont.FixedFont))
        self.text.setAccessibleName("Details of the fault")
        self.text.setTabChangesFocus(True)
        where = QLabel(f"The log is in {log_path}" if log_path else "No log is kept")
        where.setTextInteractionFlags(Qt.TextInteractionFlag.TextSelectableByMouse)
        where.setWordWrap(True)
        keep_look(where, "soft")
        self.save_button = QPushButton("Save a copy of the book…")
        self.copy_button = QPushButton("Copy the details")
        self.close_button = QPushButton("Go on")
        keep_look(self.close_button, "first")
        self.close_button.setDefault(True)
        self.save_button.setVisible(save_copy is not None)
        if save_copy is not None:
            self.save_button.clicked.connect(lambda: save_copy())
        self.copy_button.clicked.connect(self.copy_details)
        self.close_button.clicked.connect(self.accept)
        buttons = QHBoxLayout()
        buttons.setSpacing(GAP)
        buttons.addWidget(self.copy_button)
        buttons.addStretch(1)
        buttons.addWidget(self.save_button)
        buttons.addWidget(self.close_button)
        rows = QVBoxLayout(self)
        rows.setContentsMargins(WIDE, WIDE, WIDE, WIDE)
        rows.setSpacing(GAP + HALF)
        for part in (what, told, self.text, where):
            rows.addWidget(part, 1 if part is self.text else 0)
        rows.addLayout(buttons)
        self.resize(680, 440)

    @property
    def details(self) -> str:
        """Versions and all faults shown so far."""
        return "\n\n".join((versions(), *self._details))

    def add(self, details: str) -> None:
        """Show one more fault."""
        self._details.append(details)
        self.text.setPlainText(self.details)

    def copy_details(self) -> None:
        """Put the details on the clipboard."""
        QGuiApplication.clipboard().setText(self.details)


class ErrorKeeper(QObject):
    """Takes every exception nobody caught, in any thread, and shows each kind once.

    Attributes
    ----------
    window : QWidget or None
        Over which the dialog opens.
    book_is_open : callable or None
        Tells whether there is a book to save.
    save_copy : callable or None
        Saves a copy of it.
    dialog : ErrorDialog or None
        The one that is open.
    """

    _caught = Signal(str, str)

    def __init__(self, parent: QObject | None = None, *, log_path: Path | None = None) -> None:
        super().__init__(parent)
        self.window: QWidget | None = None
        self.book_is_open: Callable[[], bool] | None = None
        self.save_copy: Callable[[], None] | None = None
        self.dialog: ErrorDialog | None = None
        self._log_path = log_path
        self._seen: set[str] = set()
        self._crash_file: IO[str] | None = None
        self._former = (sys.excepthook, threading.excepthook)
        # From whatever thread, the dialog is made on the one that owns this object.
        self._caught.connect(self._show, Qt.ConnectionType.QueuedConnection)

    def install(self) -> None:
        """Take over."""
        self._former = (sys.excepthook, threading.excepthook)
        sys.excepthook = self._on_exception
        threading.excepthook = self._on_thread_exception
        qInstallMessageHandler(_log_message_of_qt)
        if self._log_path is not None:
            try:
                self._crash_file = (self._log_path.parent / "crash.log").open("a", encoding="utf-8")
            except OSError as error:
                _log.warning("crashes are not written down: %s", error)
            else:
                faulthandler.enable(self._crash_file)

    def uninstall(self) -> None:
        """Give back what was taken over."""
        sys.excepthook, threading.excepthook = self._former
        qInstallMessageHandler(None)
        if self._crash_file is not None:
            faulthandler.disable()
            self._crash_file.close()
            self._crash_file = None

    def show_error(self, error: BaseException) -> None:
        """Show an exception that was caught and is a fault of the program."""
        self._on_exception(type(error), error, error.__traceback__)

    def _on_exception(
        self, kind: type[BaseException], error: BaseException, trace: TracebackType | None
    ) -> None:
        if issubclass(kind, KeyboardInterrupt):
            QGuiApplication.quit()
            return
        signature = _signature(kind, trace)
        if signature in self._seen:
            # A fault in painting comes back with every paint.
            _log.debug("once more: %s", signature)
            return
        self._seen.add(signature)
        _log.critical("not caught", exc_info=(kind, error, trace))
        text = "".join(traceback.format_exception(kind, error, trace))
        self._caught.emit(signature, text)

    def _on_thread_exception(self, given: threading.ExceptHookArgs) -> None:
        if given.exc_type is not SystemExit and given.exc_value is not None:
            self._on_exception(given.exc_type, given.exc_value, given.exc_traceback)

    def _show(self, _signature: str, text: str) -> None:
        if len(self._seen) > _MOST_SHOWN:
            # Faults without end would be windows without end: they are in the log.
            return
        if self.dialog is None:
            is_open = self.book_is_open is not None and self.book_is_open()
            save_copy = self.save_copy if is_open else None
            self.dialog = ErrorDialog(self.window, save_copy=save_copy, log_path=self._log_path)
            self.dialog.finished.connect(self._on_finished)
            self.dialog.add(text)
            self.dialog.open()
        else:
            self.dialog.add(text)

    def _on_finished(self) -> None:
        self.dialog = None


def _signature(kind: type[BaseException], trace: TracebackType | None) -> str:
    """The same for two exceptions of one kind from one place."""
    last = trace
    while last is not None and last.tb_next is not None:
        last = last.tb_next
    place = f"{last.tb_frame.f_code.co_filename}:{last.tb_lineno}" if last is not None else "nowhere"
    return f"{kind.__qualname__} at {place}"


def _log_message_of_qt(kind: QtMsgType, _context: QMessageLogContext, message: str | None) -> None:
    levels = {
        QtMsgType.QtDebugMsg: logging.DEBUG,
        QtMsgType.QtInfoMsg: logging.INFO,
        QtMsgType.QtWarningMsg: logging.WARNING,
        QtMsgType.QtCriticalMsg: logging.ERROR,
        QtMsgType.QtFatalMsg: logging.CRITICAL,
    }
    logging.getLogger("qt").log(levels.get(kind, logging.WARNING), "%s", message)
