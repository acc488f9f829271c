"""Where a result comes from."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Provenance"]


@dataclass(frozen=True)
class Provenance:
    """Carried by every result.

    Attributes
    ----------
    book_digest : str
        SHA-256 of the book's contents, hexadecimal.
    program_version : str
    settings : tuple of (str, str)
        Name and value of each setting that the result depends on beside the book.
    seed : int or None
        Seed of the draws, where there are any.
    """

    book_digest: str
    program_version: str
    settings: tuple[tuple[str, str], ...] = ()
    seed: int | None = None
