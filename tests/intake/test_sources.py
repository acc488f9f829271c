"""Files that are no book workbook: one clear fault each, in bounded time and memory."""

from __future__ import annotations

import os
import struct
import subprocess
import sys
import threading
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

from desk.book import Severity
from desk.intake import processes, source
from desk.intake.processes import Limits, ask
from desk.intake.workbook import read_workbook
from tests.intake.books import save, sound_sheets
from tests.intake.raw_workbook import MAIN, raw_workbook, sheet_xml

Make = Callable[[Path], object]


def _locked(path: Path) -> None:
    """A workbook under a password is a compound file with a stream of this name ([MS-OFFCRYPTO], 2.3.4)."""
    free, end, chain, fat = 0xFFFFFFFF, 0xFFFFFFFE, 512, 0xFFFFFFFD
    header = bytes.fromhex("d0cf11e0a1b11ae1") + bytes(16)
    header += struct.pack("<HHHHH", 0x3E, 3, 0xFFFE, 9, 6) + bytes(6)
    header += struct.pack("<IIIIIIIII", 0, 1, 1, 0, 4096, end, 0, end, 0) + struct.pack(
        "<109I", 0, *[free] * 108
    )
    table = struct.pack("<128I", fat, end, *[free] * 126)

    def entry(name: str, kind: int, left: int, right: int, child: int) -> bytes:
        text = name.encode("utf-16-le") + b"\0\0"
        return (
            text.ljust(64, b"\0")
            + struct.pack("<HBBIII", len(text), kind, 1, left, right, child)
            + bytes(36)
            + struct.pack("<IQ", end, 0)
        )

    folder = entry("Root Entry", 5, free, free, 1)
    folder += entry("EncryptedPackage", 2, free, 2, free) + entry("EncryptionInfo", 2, free, free, free)
    path.write_bytes(header + table + folder.ljust(chain, b"\0"))


def _encrypted_zip(path: Path) -> None:
    data = bytearray(save(sound_sheets(), path).read_bytes())
    for mark, flags in ((b"PK\x03\x04", 6), (b"PK\x01\x02", 8)):
        place = data.find(mark)
        while place >= 0:
            data[place + flags] |= 1
            place = data.find(mark, place + 4)
    path.write_bytes(data)


def _cut(path: Path) -> None:
    data = save(sound_sheets(), path).read_bytes()
    path.write_bytes(data[: len(data) // 2])


def _spoilt_inside(path: Path) -> None:
    data = bytearray(save(sound_sheets(), path).read_bytes())
    place = data.find(b"xl/worksheets/sheet3.xml") + 60
    data[place : place + 40] = bytes(range(40))
    path.write_bytes(data)


def _bomb(path: Path) -> None:
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as package:
        package.writestr("_rels/.rels", "<Relationships/>")
        package.writestr("xl/workbook.xml", "<workbook/>")
        with package.open("xl/worksheets/sheet1.xml", "w") as part:
            for _ in range(48):
                part.write(b" " * (1 << 20))


def _entities(path: Path, *, hidden: bool = False) -> None:
    names = [f'<!ENTITY a{level} "{f"&a{level - 1};" * 10}">' for level in range(1, 10)]
    kind = f'<!DOCTYPE x [<!ENTITY a0 "ha">{"".join(names)}]>'
    comment = f"<!--{'x' * 70_000}-->" if hidden else ""
    cell = '<row r="1"><c r="A1" t="inlineStr"><is><t>&a9;</t></is></c></row>'
    sheet = f'<worksheet xmlns="{MAIN}"><sheetData>{cell}</sheetData></worksheet>'
    raw_workbook(path, {"Curve": f'<?xml version="1.0"?>{comment}{kind}{sheet}'})


def _pipe(path: Path) -> None:
    if hasattr(os, "mkfifo"):
        os.mkfifo(path)
    else:
        path.symlink_to(os.devnull)


def _stray(cell: str) -> Make:
    row = cell.lstrip("ABCDEFGHIJKLMNOPQRSTUVWXYZ")
    rows = '<row r="1"><c r="A1"><v>1</v></c></row>' + f'<row r="{row}"><c r="{cell}"><v>1</v></c></row>'
    return lambda path: raw_workbook(path, {"Liabilities": sheet_xml(rows)})


@pytest.mark.parametrize(
    ("make", "place", "words"),
    [
        (lambda path: path.write_bytes(b""), "", "the file is empty"),
        (lambda path: path.write_bytes(bytes(range(256)) * 20), "", "no spreadsheet"),
        (lambda path: path.write_text("Line,Amount\nA,1\n"), "", "no spreadsheet"),
        (lambda path: path.mkdir(), "", "this is a folder"),
        (lambda path: None, "", "no such file"),
        (_cut, "", "damaged"),
        (_spoilt_inside, "", "damaged"),
        (_locked, "", "password"),
        (_encrypted_zip, "", "password"),
        (_bomb, "", "no honest workbook"),
        (_entities, "", "a document type of its own"),
        (lambda path: _entities(path, hidden=True), "", "damaged"),
        (lambda path: raw_workbook(path, {}), "", "no sheets"),
        (_stray("XFD1048576"), "Liabilities!XFD1048576", "a cell stands at XFD1048576"),
        (_stray("ZZ200000"), "Liabilities!ZZ200000", "more memory than it may"),
        (_stray("XFD3000"), "Liabilities!XFD3000", "more memory than it may"),
        (_pipe, "", "no file"),
    ],
    ids=[
        *("zero bytes", "noise", "text", "folder", "missing", "cut", "spoilt", "locked", "encrypted", "bomb"),
        *("entities", "hidden entities", "no sheets", "stray corner", "stray wide", "stray near", "pipe"),
    ],
)
def test_what_is_no_workbook_gives_one_clear_fault(
    make: Make, place: str, words: str, tmp_path: Path
) -> None:
    path = tmp_path / "book.xlsx"
    make(path)
    reading = read_workbook(path, limits=Limits(memory_bytes=2 << 30, seconds=60.0))
    assert len(reading.faults) == 1, [str(fault) for fault in reading.faults]
    (fault,) = reading.faults
    assert fault.severity is Severity.GRAVE
    assert fault.place == place
    assert words in fault.found
    assert "\n" not in str(fault)
    assert reading.book is None
    assert (len(reading.sha256) == 64) == path.is_file()


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(path: Path) -> str:
        raise PermissionError(13, "Permission denied", str(path))

    monkeypatch.setattr(source, "_digest", refuse)
    (fault,) = read_workbook(save(sound_sheets(), tmp_path / "book.xlsx")).faults
    assert fault.found == "the file cannot be opened: Permission denied"


def test_a_hostile_file_never_grows_the_program(tmp_path: Path) -> None:
    resource = pytest.importorskip("resource")
    path = tmp_path / "book.xlsx"
    _stray("XFD20000")(path)
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    read_workbook(path, limits=Limits(memory_bytes=1 << 30, seconds=60.0))
    grown = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before
    assert grown * (1 if sys.platform == "darwin" else 1024) < 100e6


def test_a_reading_that_takes_too_long_is_stopped(tmp_path: Path) -> None:
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    (answer,) = ask(("both",), path, Limits(seconds=0.0))
    assert answer.refused == "time"
    (fault,) = read_workbook(path, limits=Limits(seconds=0.0)).faults
    assert "took too long" in fault.found


def test_a_reader_that_breaks_is_said_to(tmp_path: Path) -> None:
    (answer,) = ask(("no such command",), save(sound_sheets(), tmp_path / "book.xlsx"), Limits())
    assert answer.refused == "crash"
    assert "no such command" in answer.detail


def test_what_a_parser_says_stays_with_the_parser(tmp_path: Path) -> None:
    path = tmp_path / "book.xlsx"
    _cut(path)
    (fault,) = read_workbook(path).faults
    assert fault.found == "the file is damaged and cannot be read"


def test_a_workbook_without_its_list_of_sheets_has_a_grave_fault(tmp_path: Path) -> None:
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    with zipfile.ZipFile(path) as package:
        parts = {name: package.read(name) for name in package.namelist() if name != "xl/workbook.xml"}
    with zipfile.ZipFile(path, "w") as package:
        for name, content in parts.items():
            package.writestr(name, content)
    reading = read_workbook(path)
    assert reading.book is None
    assert [fault.severity for fault in reading.faults] == [Severity.GRAVE]


def test_a_reading_process_ends_with_the_program(tmp_path: Path) -> None:
    """Its input ends when the program is killed, and so does it, whatever it is doing."""
    work = (
        "import sys, time; from desk.intake import worker;"
        "worker._COMMANDS['wait'] = lambda path: time.sleep(600) or {};"
        "sys.exit(worker.main(['wait', 'book.xlsx', str(3 << 30), '60']))"
    )
    home = Path(__file__).resolve().parents[2]
    with subprocess.Popen([sys.executable, "-c", work], stdin=subprocess.PIPE, cwd=home) as child:
        assert child.stdin is not None
        child.stdin.close()
        assert child.wait(timeout=60) == 1


class _Stop(Exception):
    """Raised by a progress callback to stop the reading."""


@pytest.mark.parametrize("at", [0.0, 0.01, 0.9, 1.0])
def test_stopping_leaves_nothing_behind(at: float, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    started: list[processes._Process] = []
    real = processes._Process

    class _Noted(real):  # type: ignore[misc, valid-type]
        def __init__(self, command: str, path: Path, limits: Limits) -> None:
            super().__init__(command, path, limits)
            started.append(self)

    monkeypatch.setattr(processes, "_Process", _Noted)
    path = save(sound_sheets(), tmp_path / "book.xlsx")
    kept = set(tmp_path.iterdir())
    threads = threading.active_count()

    def progress(part: float) -> None:
        if part >= at:
            raise _Stop

    with pytest.raises(_Stop):
        read_workbook(path, progress=progress)
    assert all(process._child.poll() is not None for process in started)
    assert threading.active_count() == threads
    assert set(tmp_path.iterdir()) == kept


def test_progress_rises_to_one(tmp_path: Path) -> None:
    parts: list[float] = []
    read_workbook(save(sound_sheets(), tmp_path / "book.xlsx"), progress=parts.append)
    assert parts == sorted(parts)
    assert parts[0] == 0.0
    assert parts[-1] == 1.0


def test_another_format_is_read_with_a_word_about_what_it_hides(tmp_path: Path) -> None:
    path = tmp_path / "book.ods"
    cells = "".join(
        f'<table:table-row><table:table-cell office:value-type="float" office:value="{term}"/>'
        f'<table:table-cell office:value-type="float" office:value="{rate}"/></table:table-row>'
        for term, rate in ((1, 0.02), (2, 0.03))
    )
    heads = "".join(
        f'<table:table-cell office:value-type="string"><text:p>{text}</text:p></table:table-cell>'
        for text in ("Term", "Rate")
    )
    names = "".join(
        f' xmlns:{short}="urn:oasis:names:tc:opendocument:xmlns:{short}:1.0"'
        for short in ("office", "table", "text")
    )
    kind = "application/vnd.oasis.opendocument.spreadsheet"
    with zipfile.ZipFile(path, "w") as package:
        package.writestr("mimetype", kind)
        package.writestr(
            "META-INF/manifest.xml",
            '<manifest:manifest xmlns:manifest="urn:oasis:names:tc:opendocument:xmlns:manifest:1.0"/>',
        )
        package.writestr(
            "content.xml",
            f'<?xml version="1.0"?><office:document-content{names}><office:body><office:spreadsheet>'
            f'<table:table table:name="Curve"><table:table-row>{heads}</table:table-row>{cells}</table:table>'
            "</office:spreadsheet></office:body></office:document-content>",
        )
    reading = read_workbook(path)
    assert any("do not show" in fault.found and fault.severity is Severity.MILD for fault in reading.faults)
    (grid,) = reading.sheets
    assert list(grid.rows) == [["Term", "Rate"], [1.0, 0.02], [2.0, 0.03]]
