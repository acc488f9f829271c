"""The tables of the station Curve, of which only those that belong to the curve are offered."""

from __future__ import annotations

from collections.abc import Sequence

from desk.window.standing.pages import Pages

__all__ = ["SomePages"]


class SomePages(Pages):
    """Pages of which some are hidden."""

    @property
    def shown_keys(self) -> tuple[str, ...]:
        """The keys of the pages offered."""
        return tuple(key for place, key in enumerate(self._keys) if self.tabs.isTabVisible(place))

    def set_title(self, key: str, title: str) -> None:
        """Put another title on the tab of a page."""
        self.tabs.setTabText(self._keys.index(key), title)

    def show_only(self, keys: Sequence[str]) -> None:
        """Offer these pages and no others."""
        for place, key in enumerate(self._keys):
            self.tabs.setTabVisible(place, key in keys)
