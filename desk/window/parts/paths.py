"""Paths compared."""

from __future__ import annotations

import os
from pathlib import Path

__all__ = ["is_inside", "is_same_file"]


def is_same_file(one: Path, other: Path) -> bool:
    """Whether two paths lead to one file, there or not."""
    try:
        return os.path.samefile(one, other)
    except OSError:
        return os.path.abspath(one) == os.path.abspath(other)


def is_inside(path: Path, folder: Path) -> bool:
    """Whether a path lies below a folder, without asking the disk."""
    return os.path.abspath(path).startswith(os.path.abspath(folder) + os.sep)
