"""Where the files that come with the program are: resources and demo books."""

from __future__ import annotations

from pathlib import Path

__all__ = ["demo_books", "resources"]


def _beside(name: str) -> Path:
    """A folder beside the package in a source tree, inside it once installed from a wheel."""
    inside = Path(__file__).parent / name
    return inside if inside.is_dir() else Path(__file__).parent.parent / name


def resources() -> Path:
    """The folder of what is not code: icons, style, published tables."""
    return _beside("resources")


def demo_books() -> Path:
    """The folder of the invented demo books."""
    return _beside("demo_books")
