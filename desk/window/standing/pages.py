"""Pages with tabs, which several stations share."""

from desk.window.parts.pages import Pages

__all__ = ["Pages"]
