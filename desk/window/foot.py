"""The foot: what runs, and the caution while nothing does."""

from __future__ import annotations

from PySide6.QtCore import Qt, QTimer
from PySide6.QtGui import QAccessible, QAccessibleAnnouncementEvent, QPainter, QPaintEvent
from PySide6.QtWidgets import (
    QHBoxLayout,
    QLabel,
    QProgressBar,
    QPushButton,
    QSizePolicy,
    QStackedWidget,
    QWidget,
)

from desk.report.wording import CAUTION
from desk.window.jobs import Job, Jobs
from desk.window.parts import numbers
from desk.window.parts.theme import GAP, WIDE, ThemeSwitch, keep_look

__all__ = ["Foot", "time_left"]

_SHOWN_AFTER_MS = 200
"""What is over sooner is not worth a flicker."""
_MESSAGE_MS = 8_000
_STEPS = 1_000


def time_left(seconds: float | None) -> str:
    """A remaining time in words, no more exact than such an estimate is."""
    if seconds is None:
        return ""
    if seconds < 1.5:
        return "a moment left"
    if seconds < 90:
        return f"about {numbers.integer(round(seconds))} s left"
    minutes = seconds / 60
    if minutes < 90:
        return f"about {numbers.integer(round(minutes))} min left"
    return f"about {numbers.number(minutes / 60, 1)} h left"


class Foot(QWidget):
    """The line at the bottom of the window.

    Attributes
    ----------
    cancel_button : QPushButton
        Cancels the job that is shown.
    """

    def __init__(self, jobs: Jobs, theme_switch: ThemeSwitch, parent: QWidget | None = None) -> None:
        super().__init__(parent)
        self._jobs = jobs
        self._theme_switch = theme_switch
        self._shown: Job | None = None
        self.setAccessibleName("What runs")
        self.setFocusPolicy(Qt.FocusPolicy.TabFocus)
        self._message = QLabel(CAUTION)
        keep_look(self._message, "soft")
        self._message.setSizePolicy(QSizePolicy.Policy.Ignored, QSizePolicy.Policy.Preferred)
        self._title = QLabel()
        self._bar = QProgressBar()
        self._bar.setRange(0, _STEPS)
        self._bar.setTextVisible(False)
        self._bar.setFixedHeight(GAP)
        self._bar.setMinimumWidth(160)
        self._bar.setMaximumWidth(360)
        self._bar.setAccessibleName("Progress")
        self._left = QLabel()
        keep_look(self._left, "soft")
        self.cancel_button = QPushButton("Cancel")
        self.cancel_button.setToolTip("Stop what runs; what there was before stays")
        self.cancel_button.clicked.connect(self._on_cancel)
        self._stack = QStackedWidget()
        self._stack.addWidget(self._message)
        self._stack.addWidget(self._running_row())
        row = QHBoxLayout(self)
        row.setContentsMargins(WIDE, 0, GAP, 0)
        row.addWidget(self._stack)
        self.setFixedHeight(self.cancel_button.sizeHint().height() + GAP)
        self._delay = QTimer(self)
        self._delay.setSingleShot(True)
        self._delay.setInterval(_SHOWN_AFTER_MS)
        self._delay.timeout.connect(self._show_running)
        self._back = QTimer(self)
        self._back.setSingleShot(True)
        self._back.setInterval(_MESSAGE_MS)
        self._back.timeout.connect(self.show_caution)
        jobs.started.connect(self._on_started)
        jobs.progressed.connect(self._on_progressed)
        jobs.ended.connect(self._on_ended)
        theme_switch.changed.connect(lambda _: self.update())

    def _running_row(self) -> QWidget:
        page = QWidget()
        row = QHBoxLayout(page)
        row.setContentsMargins(0, 0, 0, 0)
        row.setSpacing(GAP + GAP)
        for part in (self._title, self._bar, self._left, self.cancel_button):
            row.addWidget(part, 1 if part is self._bar else 0)
        row.addStretch(1)
        return page

    @property
    def text(self) -> str:
        """What the foot says now."""
        if self.is_running:
            return " ".join(part for part in (self._title.text(), self._left.text()) if part)
        return self._message.text()

    @property
    def is_running(self) -> bool:
        """Whether a job is shown."""
        return self._stack.currentIndex() == 1

    def tell(self, message: str, *, grave: bool = False) -> None:
        """Show a message for a while, and say it to those who listen."""
        self._message.setText(message)
        self._message.setToolTip(message)
        self._look(self._message, "grave" if grave else "soft")
        self._back.start()
        if QAccessible.isActive():
            QAccessible.updateAccessibility(QAccessibleAnnouncementEvent(self, message))

    def take_focus(self) -> None:
        """Give the keyboard to the cancel button, or to the foot while nothing runs."""
        target = self.cancel_button if self.is_running else self
        target.setFocus(Qt.FocusReason.ShortcutFocusReason)

    @staticmethod
    def _look(label: QLabel, look: str) -> None:
        keep_look(label, look)
        label.style().unpolish(label)
        label.style().polish(label)

    def show_caution(self) -> None:
        """Show the caution in the place of a message."""
        self._message.setText(CAUTION)
        self._message.setToolTip(CAUTION)
        self._look(self._message, "soft")

    def _on_started(self, _job: Job) -> None:
        if not self._delay.isActive() and not self.is_running:
            self._delay.start()

    def _on_progressed(self, _job: Job) -> None:
        if self.is_running:
            self._show_running()

    def _on_ended(self, _job: Job) -> None:
        if self._jobs.running:
            if self.is_running:
                self._show_running()
            return
        self._delay.stop()
        self._shown = None
        had_focus = self.cancel_button.hasFocus()
        self._stack.setCurrentIndex(0)
        if had_focus:
            self.setFocus()

    def _show_running(self) -> None:
        running = self._jobs.running
        if not running:
            return
        # The longest at work is what the reader waits for.
        job = running[0]
        self._shown = job
        more = len(running) - 1
        also = f" and {numbers.integer(more)} more" if more else ""
        self._title.setText(f"Stopping: {job.title}{also}" if job.is_stopping else f"{job.title}{also}")
        self._bar.setValue(round(_STEPS * job.progress))
        part = numbers.number(100 * job.progress, 0)
        left = time_left(job.remaining_seconds)
        self._left.setText(f"{part} %, {left}" if left else f"{part} %")
        self.cancel_button.setEnabled(not job.is_stopping)
        self.cancel_button.setAccessibleName(f"Cancel: {job.title}")
        self._stack.setCurrentIndex(1)

    def _on_cancel(self) -> None:
        if self._shown is not None:
            self._jobs.cancel(self._shown)
            if self._jobs.running:
                self._show_running()

    def paintEvent(self, _event: QPaintEvent) -> None:
        """The line above, and the frame of what has the keyboard."""
        theme = self._theme_switch.theme
        painter = QPainter(self)
        painter.setPen(theme.hairline)
        painter.drawLine(0, 0, self.width(), 0)
        if self.hasFocus():
            painter.setPen(theme.focus)
            painter.drawRect(self.rect().adjusted(2, 2, -3, -3))
        painter.end()
