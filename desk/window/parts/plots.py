"""Pictures: a canvas with a title, a sentence, a reading line, and ways to save it."""

from __future__ import annotations

import re
from pathlib import Path

import numpy as np
from PySide6.QtCore import QPointF, Qt, Signal
from PySide6.QtGui import QContextMenuEvent, QGuiApplication, QImage, QKeyEvent, QResizeEvent
from PySide6.QtWidgets import QFileDialog, QLabel, QMenu, QToolButton, QVBoxLayout, QWidget

from desk.book.arrays import FloatArray
from desk.window.parts import numbers
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.picture_file import picture_image, write_picture
from desk.window.parts.plot_canvas import Canvas
from desk.window.parts.theme import GAP, HALF, ThemeSwitch, keep_look

__all__ = ["Picture"]


class Picture(Canvas):
    """A picture: what `Canvas` shows, under a title, with a reading line.

    Left and Right move the reading line, with Shift by ten places, Home and End to the ends; plus, minus
    and 0 zoom; Escape takes the line away.

    Signals
    -------
    reading_changed(str)
        What stands at the reading line, as text; empty when it goes.
    message(str)
        Something to tell the reader.
    """

    reading_changed = Signal(str)
    message = Signal(str)

    def __init__(
        self, title: str, theme_switch: ThemeSwitch, *, description: str = "", parent: QWidget | None = None
    ) -> None:
        super().__init__(theme_switch, parent)
        self._reading_place: float | None = None
        self._reading = ""
        # A line set by the keyboard stays when the pointer goes.
        self._is_kept = False
        self._description = description
        self.page = QWidget(self)
        keep_look(self.page, "surface")
        self._title = QLabel()
        self._title.setTextFormat(Qt.TextFormat.PlainText)
        keep_look(self._title, "strong")
        self._strip = ElidedLabel()
        keep_look(self._strip, "soft")
        column = QVBoxLayout(self.page)
        column.setContentsMargins(GAP, GAP, GAP, HALF)
        column.setSpacing(HALF)
        column.addWidget(self._title)
        column.addWidget(self._strip)
        column.addLayout(self._column, 1)
        whole = QVBoxLayout(self)
        whole.setContentsMargins(0, 0, 0, 0)
        whole.addWidget(self.page)
        self.button = QToolButton(self)
        self.button.setText("Save…")
        self.button.setPopupMode(QToolButton.ToolButtonPopupMode.InstantPopup)
        self._menu = self._make_menu()
        self.button.setMenu(self._menu)
        self.plot.pointed.connect(self._on_pointed)
        self.plot.left.connect(self._on_pointer_left)
        self.plot.key_pressed.connect(self._on_key)
        self.set_title(title)
        self.set_description(description)

    # What it says

    @property
    def title(self) -> str:
        """The title."""
        return self._title.text()

    def set_title(self, title: str) -> None:
        """Name the picture."""
        self._title.setText(title)
        self.setAccessibleName(title)
        for part in (self.plot, self.plot.viewport()):
            part.setAccessibleName(f"Picture: {title}")
        self.button.setAccessibleName(f"Save or copy the picture {title}")

    @property
    def description(self) -> str:
        """The sentence under the title."""
        return self._description

    def set_description(self, description: str) -> None:
        """Say in one sentence what the picture shows, with its key figures."""
        self._description = description
        self.setAccessibleDescription(description)
        self.plot.setAccessibleDescription(description)
        if not self._reading:
            self._strip.set_text(description)

    @property
    def reading(self) -> str:
        """What stands at the reading line; empty where there is none."""
        return self._reading

    def settle(self) -> None:
        """Bring the picture up to date with its series; done by itself when idle."""
        super().settle()
        if self._reading_place is not None:
            self._read_at(self._reading_place)

    def clear(self) -> None:
        """Take out everything but the axes."""
        super().clear()
        self.stop_reading()

    # Keys

    def _on_key(self, event: QKeyEvent) -> None:
        key = event.key()
        steps = {Qt.Key.Key_Left: -1, Qt.Key.Key_Right: 1}
        if key in steps:
            self.step_reading(
                steps[Qt.Key(key)] * (10 if event.modifiers() & Qt.KeyboardModifier.ShiftModifier else 1)
            )
        elif key == Qt.Key.Key_Home:
            self.step_reading(-(10**9))
        elif key == Qt.Key.Key_End:
            self.step_reading(10**9)
        elif key in (Qt.Key.Key_Plus, Qt.Key.Key_Equal):
            self.zoom(0.8, about=self._reading_place)
        elif key == Qt.Key.Key_Minus:
            self.zoom(1.25, about=self._reading_place)
        elif key == Qt.Key.Key_0:
            self.reset_view()
        elif key == Qt.Key.Key_Escape and self._reading:
            self.stop_reading()
        else:
            return
        event.accept()

    # Reading

    def _places(self) -> FloatArray:
        left, stop, _, _ = self._view()
        found = [series.places() for series in self._series.values()]
        every = np.unique(np.concatenate(found)) if found else np.empty(0)
        slack = 1e-9 * (stop - left)
        return every[(every >= left - slack) & (every <= stop + slack)]

    def step_reading(self, steps: int) -> None:
        """Move the reading line by so many of the places where there is something to read."""
        places = self._places()
        if not places.size:
            return
        if self._reading_place is None:
            place = steps - 1 if steps > 0 else len(places) + steps
        else:
            place = int(np.abs(places - self._reading_place).argmin()) + steps
        self._read_at(float(places[min(max(place, 0), len(places) - 1)]))
        self._is_kept = True

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Names and values, as shown, of every series at `x`."""
        return [
            (name, (self._right if series.on_right else self._y).text(value))
            for series in self._series.values()
            for name, value in series.readings(x)
        ]

    def stop_reading(self) -> None:
        """Take the reading line away."""
        self._reading_place = None
        self._cursor.setVisible(False)
        self._say("")

    def _read_at(self, x: float) -> None:
        places = self._places()
        if not places.size:
            self.stop_reading()
            return
        place = float(places[np.abs(places - x).argmin()])
        self._reading_place = place
        self._cursor.setPos(place)
        self._cursor.setVisible(True)
        names = self.plot.axes["bottom"].names
        where = names.get(place) or self._x_text(place)
        unit = self._x.shown_unit
        head = f"{self._x.label} {where}" + (f" {unit}" if unit and place not in names else "")
        values = "  ·  ".join(f"{name} {text}" for name, text in self.readings_at(place))
        units = "" if self._has_right or not self._y.shown_unit else f"  ({self._y.shown_unit})"
        self._say(f"{head}:  {values}{units}" if values else head)

    def _x_text(self, x: float) -> str:
        shown = x * self._x.factor
        if self._x.digits is not None:
            return numbers.number(shown, self._x.digits)
        digits = next(
            (digits for digits in range(4) if abs(round(shown, digits) - shown) < 1e-9 * max(1, abs(shown))),
            3,
        )
        return numbers.number(shown, digits)

    def _say(self, reading: str) -> None:
        if reading == self._reading:
            return
        self._reading = reading
        self._strip.set_text(reading or self._description)
        self.reading_changed.emit(reading)

    def _on_pointed(self, place: QPointF) -> None:
        self._is_kept = False
        self._read_at(place.x())

    def _on_pointer_left(self) -> None:
        if not self._is_kept:
            self.stop_reading()

    # Saving

    def save(self, path: Path) -> None:
        """Write the picture to a ``.png`` (twice the size on screen) or ``.svg`` file, whole or not at all.

        Raises
        ------
        ValueError
            If the name ends in neither.
        OSError
            If it cannot be written.
        """
        with self._still():
            write_picture(self.page, path, title=self.title, description=self.description)

    def copy(self) -> None:
        """Put the picture on the clipboard."""
        with self._still():
            image = self.image()
        QGuiApplication.clipboard().setImage(image)
        self.message.emit("Copied the picture.")

    def image(self) -> QImage:
        """The picture at twice the size on screen."""
        return picture_image(self.page)

    def _still(self) -> _Still:
        return _Still(self)

    def _ask_and_save(self) -> None:
        name = re.sub(r"[^\w-]+", "-", self.title.casefold()).strip("-") or "picture"
        chosen, _ = QFileDialog.getSaveFileName(
            self, "Save the picture", f"{name}.png", "PNG picture (*.png);;SVG picture (*.svg)"
        )
        if not chosen:
            return
        path = Path(chosen)
        if path.suffix.casefold() not in (".png", ".svg"):
            path = path.with_name(path.name + ".png")
        try:
            self.save(path)
        except OSError as error:
            self.message.emit(f"The picture could not be saved: {error}")
        else:
            self.message.emit(f"Saved {path.name}.")

    def _make_menu(self) -> QMenu:
        menu = QMenu(self)
        menu.addAction("Save as PNG or SVG…", self._ask_and_save)
        menu.addAction("Copy the picture", self.copy)
        menu.addSeparator()
        menu.addAction("Show the whole picture", self.reset_view)
        return menu

    # What Qt calls

    def contextMenuEvent(self, event: QContextMenuEvent) -> None:
        """Show the menu."""
        self._menu.popup(event.globalPos())

    def resizeEvent(self, event: QResizeEvent) -> None:
        """Keep the button in its corner."""
        super().resizeEvent(event)
        size = self.button.sizeHint()
        self.button.setGeometry(self.width() - size.width() - HALF, HALF, size.width(), size.height())
        self.button.raise_()


class _Still:
    """Holds a picture still for its portrait: nothing pending, no reading line."""

    def __init__(self, picture: Picture) -> None:
        self._picture = picture
        self._place: float | None = None

    def __enter__(self) -> None:
        picture = self._picture
        self._place = picture._reading_place
        picture.stop_reading()
        picture.settle()

    def __exit__(self, *_: object) -> None:
        if self._place is not None:
            self._picture._read_at(self._place)
