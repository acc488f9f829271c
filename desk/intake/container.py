"""What may be opened at all: the look at a file before anything reads it.

Only the reading processes call this: nothing of a source is opened in the program's own process.
"""

from __future__ import annotations

import re
import zipfile
from pathlib import Path

__all__ = ["Refused", "examine"]

_MOST_PARTS = 10_000
_MOST_BYTES = 2 << 30
"""Of all parts together, unpacked."""
_RATIO_FROM_BYTES = 32 << 20
_MOST_RATIO = 300.0
"""Sheets of real data shrink to a tenth or a hundredth; a bomb to a thousandth."""
_HEAD_BYTES = 1 << 16
_OLE = bytes.fromhex("d0cf11e0a1b11ae1")
_ENCRYPTED = "EncryptedPackage".encode("utf-16-le")
"""Name of the stream that holds a workbook under a password ([MS-OFFCRYPTO], 2.3.4.4)."""
_DOCTYPE = re.compile(rb"<!\s*DOCTYPE|<\0!\0D\0O\0C", re.IGNORECASE)


class Refused(Exception):
    """A source that is not read.

    Attributes
    ----------
    code : str
        One of empty, unknown, corrupt, password, bomb, entities, memory.
    detail : str
    """

    def __init__(self, code: str, detail: str = "") -> None:
        super().__init__(code, detail)
        self.code = code
        self.detail = detail


def examine(path: Path) -> str:
    """Look at a file and say what it is.

    Returns
    -------
    str
        "xlsx" for a workbook whose sheets are XML, "zip" for another packed format, "old" for a format
        that is not packed.

    Raises
    ------
    Refused
        If it is empty, no spreadsheet, broken, encrypted, or would unpack to far more than it should.
    """
    with open(path, "rb") as file:
        head = file.read(8)
    if not head:
        raise Refused("empty")
    if head == _OLE:
        if _mentions(path, _ENCRYPTED):
            raise Refused("password")
        return "old"
    if head[:2] != b"PK":
        raise Refused("unknown")
    try:
        with zipfile.ZipFile(path) as package:
            _examine_parts(package)
            names = set(package.namelist())
    except (
        zipfile.BadZipFile,
        zipfile.LargeZipFile,
        EOFError,
        OSError,
        ValueError,
        NotImplementedError,
    ) as error:
        raise Refused("corrupt", str(error)) from error
    except RuntimeError as error:  # zipfile's answer to a part under a password
        raise Refused("password", str(error)) from error
    if "_rels/.rels" in names and any(name.startswith("xl/") for name in names):
        return "zip" if "xl/workbook.bin" in names else "xlsx"
    if "content.xml" in names:
        return "zip"
    raise Refused("unknown")


def _mentions(path: Path, words: bytes) -> bool:
    """Whether `words` stand somewhere in the file."""
    kept = b""
    with open(path, "rb") as file:
        while chunk := file.read(1 << 20):
            if words in kept + chunk:
                return True
            kept = chunk[-len(words) :]
    return False


def _examine_parts(package: zipfile.ZipFile) -> None:
    parts = package.infolist()
    if len(parts) > _MOST_PARTS:
        raise Refused("bomb", f"it holds {len(parts):,} parts")
    unpacked = sum(part.file_size for part in parts)
    if unpacked > _MOST_BYTES:
        raise Refused("bomb", f"it would unpack to {unpacked / 2**30:.1f} GB")
    for part in parts:
        if part.flag_bits & 1:
            raise Refused("password")
        if part.file_size > _RATIO_FROM_BYTES and part.file_size > _MOST_RATIO * max(part.compress_size, 1):
            raise Refused("bomb", f"{part.filename[:60]} would unpack to {part.file_size / 2**20:,.0f} MB")
        if part.filename.lower().endswith((".xml", ".rels")):
            with package.open(part) as stream:
                if _DOCTYPE.search(stream.read(_HEAD_BYTES)):
                    raise Refused("entities", part.filename[:60])
