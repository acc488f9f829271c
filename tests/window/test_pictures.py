"""Pictures without a screen."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
from PySide6.QtCore import QSize
from PySide6.QtGui import QImage

from desk import tasks
from desk.book import Inflation, Run
from desk.window.pictures import draw_all, draw_window, main
from tests.window.frame import a_book, a_reading

pytestmark = pytest.mark.usefixtures("qapp")


def _colours(image: QImage) -> int:
    return len({image.pixel(x, y) for x in range(0, image.width(), 3) for y in range(0, image.height(), 3)})


def test_every_picture_is_drawn_as_png_and_svg(tmp_path: Path) -> None:
    book = replace(a_book(model=True), run=Run(paths=200, horizon_years=5, steps_per_year=1))
    reading, standing, simulation = a_reading(book), tasks.value(book), tasks.simulate(book)
    written = draw_all(reading, standing, simulation, tmp_path / "out")
    names = {path.name for path in written}
    assert len(names) == len(written)
    assert {name.split("-")[0] for name in names} == {"curve", "standing", "shocks", "scenarios"}
    assert {path.stem for path in written if path.suffix == ".png"} == {
        path.stem for path in written if path.suffix == ".svg"
    }
    for path in written:
        if path.suffix == ".png":
            image = QImage(str(path))
            assert image.width() == 1920
            assert _colours(image) > 10, f"{path.name} is empty"
        else:
            assert ElementTree.parse(path).getroot().tag.endswith("svg")


def test_pictures_on_further_parts_of_a_station_are_drawn_too(tmp_path: Path) -> None:
    inflation = Inflation(np.array([1.0, 10.0]), np.array([0.02, 0.02]))
    plain = a_book()
    book = replace(plain, basis=replace(plain.basis, inflation=inflation))
    written = draw_all(a_reading(book), tasks.value(book), None, tmp_path)
    names = {path.stem for path in written}
    assert "standing-inflation-dv01-by-key-rate" in names
    assert {
        "shocks-change-in-surplus-by-shock",
        "shocks-surplus-against-a-parallel-move",
        "shocks-the-curve-before-and-after",
        "shocks-funding-ratio-under-all-rates-and-credit-spreads",
    } <= names
    for path in written:
        if path.suffix == ".png":
            image = QImage(str(path))
            assert (image.width(), image.height()) == (1920, 1080), path.name
            assert _colours(image) > 10, f"{path.name} is empty"


def test_without_a_simulation_its_pictures_are_left_out(tmp_path: Path) -> None:
    book = a_book()
    written = draw_all(a_reading(book), tasks.value(book), None, tmp_path)
    assert written
    assert not [path for path in written if path.name.startswith("scenarios")]


def test_a_reading_without_a_book_has_no_pictures(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="must have a book"):
        draw_all(a_reading(None), tasks.value(a_book()), None, tmp_path)


def test_the_window_is_drawn_at_every_station(tmp_path: Path) -> None:
    book = tmp_path / "book.xlsx"
    model = replace(a_book(model=True), run=Run(paths=200, horizon_years=5, steps_per_year=1))
    tasks.save_copy(model, book)
    written = draw_window(book, tmp_path / "out", size=QSize(1280, 720))
    assert [path.stem for path in written] == [
        *("welcome", "intake", "curve", "standing", "shocks", "scenarios", "report")
    ]
    for path in written:
        image = QImage(str(path))
        assert (image.width(), image.height()) == (1280, 720)
    assert not list((tmp_path / "out").glob("*.ini"))


def test_a_book_that_cannot_be_used_ends_with_status_2(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("QT_QPA_PLATFORM", "offscreen")
    bad = tmp_path / "bad.xlsx"
    bad.write_bytes(b"no workbook")
    assert main([str(tmp_path / "out"), str(bad)]) == 2
    assert capsys.readouterr().err.strip()
