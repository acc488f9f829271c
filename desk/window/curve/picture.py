"""The pictures of a curve: the curve itself, and how far it is from another or from its bonds."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from PySide6.QtWidgets import QVBoxLayout, QWidget

from desk.book.arrays import FloatArray
from desk.rates.compounding import Compounding, from_continuous
from desk.rates.fitting import CurveFit
from desk.window.curve.marks import Marks
from desk.window.curve.shown import Dots, Shown
from desk.window.curve.words import stated_as
from desk.window.parts import numbers
from desk.window.parts.labels import ElidedLabel
from desk.window.parts.plots import Picture
from desk.window.parts.theme import ThemeSwitch, keep_look

__all__ = ["CurvePicture", "MisfitPicture", "reach"]

_TITLE = "Zero rates, forward rates and discount factors"
_MOST_BEYOND = 3.0
"""Shown at most this many times as far as the last term."""
_LEAST_HEIGHT = 0.005
"""Shown above and below a flat curve [1/year]."""
_ON_CURVE = "On the curve"
_NAME_BESIDE = 0.1
"""How far the name of the bond yields stands from them, as a part of the height of what is drawn."""
_MOST_LINES = 3
"""Of the sentence and the reading."""
_DIGITS = 10
"""To which rates are drawn: beyond them there is only noise."""
_USUAL_REACH = 40.0
"""Of a curve that nothing is extrapolated of, where the book has no later flow [years]."""


def reach(shown: Shown, last_flow: float) -> float:
    """How far a curve is shown [years]: beyond its last quote, and to the last flow within reason."""
    last = shown.last_quoted
    if not np.isfinite(last):
        return float(max(np.ceil(last_flow), _USUAL_REACH))
    return float(max(1.2 * last, min(np.ceil(last_flow), _MOST_BEYOND * last)))


class _RoomyPicture(Picture):
    """A picture whose sentence and reading may go over some lines, in room that does not change."""

    def __init__(self, title: str, theme_switch: ThemeSwitch) -> None:
        super().__init__(title, theme_switch)
        former, self._strip = self._strip, ElidedLabel(lines=_MOST_LINES)
        keep_look(self._strip, "soft")
        self._strip_room = QWidget()
        column = QVBoxLayout(self._strip_room)
        column.setContentsMargins(0, 0, 0, 0)
        column.addWidget(self._strip)
        column.addStretch(1)
        layout = self.page.layout()
        if layout is not None:
            layout.replaceWidget(former, self._strip_room)
        former.hide()
        former.deleteLater()
        self.set_lines(1)
        self._is_flat = False

    def set_lines(self, count: int) -> None:
        """Give the sentence and the reading so many lines."""
        self._strip_room.setFixedHeight(count * self._strip.fontMetrics().height())

    def _give_height(self, values: FloatArray, least: float) -> None:
        """Show at least so much about values that hardly differ: what is flat is to look flat."""
        low, high = float(values.min()), float(values.max())
        if high - low < 0.1 * least:
            self._is_flat = True
            self.set_range(y=(low - least, high + least))
        elif self._is_flat:
            self._is_flat = False
            self.set_range()


def _without_noise(values: FloatArray) -> FloatArray:
    return np.asarray(np.round(values, _DIGITS))


class CurvePicture(_RoomyPicture):
    """Zero and forward rates and, on the right-hand axis, discount factors over one time axis.

    Of expected inflation the right-hand axis has the price index. A second curve lies over it, dashed, and
    the reading line says how far apart they are.
    """

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(_TITLE, theme_switch)
        self.set_right_axis("Discount factor", "", digits=4)
        self._shown: Shown | None = None
        self._other: Shown | None = None
        self._other_name = ""
        self._compounding = Compounding.ANNUAL
        self._until = 0.0

    def show_curve(
        self,
        shown: Shown,
        *,
        until: float,
        compounding: Compounding,
        title: str = _TITLE,
        other: Shown | None = None,
        other_name: str = "",
    ) -> None:
        """Draw a curve up to `until` [years], and another one over it.

        Parameters
        ----------
        shown : Shown
        until : float
        compounding : Compounding
            How the rates are shown.
        title : str
        other : Shown, optional
        other_name : str
            Stands before the names of its lines.
        """
        factor = "Index" if shown.is_index else "Discount"
        others = (f"{other_name}: zero", f"{other_name}: forward") if other is not None else ()
        quotes = shown.quotes
        marks = {quotes.name} if quotes.on_curve is None else {quotes.name, _ON_CURVE}
        for name in set(self.names) - {factor, "Forward", "Zero", *others, *marks}:
            self.remove(name)
        self._shown, self._other, self._compounding, self._until = shown, other, compounding, until
        self._other_name = other_name
        # Beside another picture there is less width.
        by_formula = shown.fit is not None and not shown.knots.size
        self.set_lines((2 if other is not None or by_formula else 1) + (quotes.on_curve is not None))
        right = "Price index" if shown.is_index else "Discount factor"
        self.set_right_axis(right, "today 1" if shown.is_index else "", digits=4)
        self.set_title(title)
        self.set_axes(
            "Term", "years", "Rate", f"% a year, {stated_as(compounding)}", y_kind="rate", y_digits=3
        )
        time = shown.times(until)
        self.add_line(factor, time, shown.factor(time), "ink_soft", dashed=True, right=True)
        forward = from_continuous(shown.curve.forward(time, time), compounding)
        if other is not None:
            at = other.times(until)
            # Thin and of one hue, as it is there to be measured against.
            self.add_line(
                f"{other_name}: forward",
                at,
                from_continuous(other.curve.forward(at, at), compounding),
                "what_if",
                dashed=True,
                strong=False,
            )
            self.add_line(f"{other_name}: zero", at, other.zero(at, compounding), "what_if", dashed=True)
        zero = _without_noise(shown.zero(time, compounding))
        self.add_line("Forward", time, _without_noise(forward), "accent")
        self.add_line("Zero", time, zero, "rates")
        self._give_height(
            zero if other is None else np.append(zero, other.zero(time, compounding)), _LEAST_HEIGHT
        )
        if quotes.on_curve is not None:
            self._add_bonds(quotes, shown, compounding)
        elif quotes.term.size:
            order = np.argsort(quotes.term, kind="stable")
            self.add_dots(
                quotes.name, quotes.term[order], from_continuous(quotes.rate[order], compounding), "rates"
            )
        is_beyond = np.isfinite(shown.last_quoted) and shown.last_quoted < until
        last = "bond" if shown.fit is not None else "quote"
        self.shade_from(shown.last_quoted if is_beyond else None, f"beyond the last {last}")
        self.set_description(f"{_sentence(shown, compounding, until)}{_of_the_marks(quotes)}")

    def _add_bonds(self, quotes: Dots, shown: Shown, compounding: Compounding) -> None:
        """Draw the yields of bonds, quoted and on the curve, in no colour of a curve: they are none."""
        assert quotes.on_curve is not None
        order = np.argsort(quotes.term, kind="stable")
        term = quotes.term[order]
        quoted, on_curve = (
            from_continuous(some[order], compounding) for some in (quotes.rate, quotes.on_curve)
        )
        # On the side where the zero rates are not, beyond the last bonds.
        last = term >= 0.75 * term[-1]
        zero = shown.zero(term[last], compounding)
        values = np.concatenate((quoted, on_curve, zero))
        apart = _NAME_BESIDE * max(float(np.ptp(values[np.isfinite(values)])), _LEAST_HEIGHT)
        if np.nanmean(zero - on_curve[last]) >= 0.0:
            level = float(np.nanmin((quoted[last], on_curve[last]))) - apart
        else:
            level = float(np.nanmax((quoted[last], on_curve[last]))) + apart
        self._put(Marks(_ON_CURVE, "ink", symbol="tick"), 29).set(term, on_curve)
        self._put(Marks(quotes.name, "ink", symbol="o"), 30).set(
            term, quoted, name_at=(float(term[-1]), level)
        )

    def clear(self) -> None:
        """Take out everything but the axes."""
        self._shown = self._other = None
        super().clear()

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """Names and values of every series at `x`, and how far the two curves are apart."""
        found = dict(super().readings_at(x))
        if self._shown is not None and self._other is not None and 0.0 <= x <= self._until:
            apart = self._shown.zero(x, self._compounding) - self._other.zero(x, self._compounding)
            found["Difference"] = f"{numbers.signed(1e4 * float(apart), 1)} bp"
        if self._shown is not None and _ON_CURVE in found:
            on_curve = found.pop(_ON_CURVE)
            found["Bond yield"] = f"{found.pop(self._shown.quotes.name)} quoted, {on_curve} on the curve"
        if self._shown is not None and x > self._shown.last_quoted:
            found["extrapolated"] = ""
        other = self._other_name
        first = ("Zero", f"{other}: zero", "Difference", "Forward", f"{other}: forward")
        order = [name for name in first if name in found]
        return [(name, found[name]) for name in (*order, *(name for name in found if name not in order))]


class MisfitPicture(_RoomyPicture):
    """How far a curve is from another one, or from each of its bonds, in basis points."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__("Difference in zero rates", theme_switch)
        self.set_lines(2)
        self._bond_terms: FloatArray = np.zeros(0)
        self._bond_names: list[str] = []

    def show_difference(
        self, shown: Shown, other: Shown, *, words: str, until: float, compounding: Compounding
    ) -> None:
        """Draw the zero rates of one curve less those of another, as `words` say, up to `until` [years]."""
        self._only("Zero rates")
        self.set_lines(2)
        self.set_range()
        self.set_title("Difference in zero rates")
        self.set_axes("Term", "years", "Difference", "bp", y_digits=1, with_zero=True)
        time = np.union1d(shown.times(until), other.times(until))
        apart = 1e4 * (shown.zero(time, compounding) - other.zero(time, compounding))
        apart = _without_noise(apart)
        self.add_line("Zero rates", time, apart, "what_if")
        self._give_height(np.append(apart, 0.0), 1.0)
        is_beyond = np.isfinite(shown.last_quoted) and shown.last_quoted < until
        self.shade_from(shown.last_quoted if is_beyond else None)
        most = int(np.abs(apart).argmax())
        where = numbers.years(float(time[most]), 1)
        largest = numbers.signed(float(apart[most]), 1)
        self.set_description(f"{words}: at most {largest} bp, at {where} years.")

    def show_misfits(self, term: FloatArray, fit: CurveFit, names: Sequence[str], words: str) -> None:
        """Draw the misfit of bonds at their maturities [years]; those left out of the fit stand apart."""
        self._only("Misfit", "Left out")
        self.shade_from(None)
        self.set_lines(3)
        self.set_title("Misfit of each bond")
        self.set_axes("Maturity", "years", "Fitted less quoted yield", "bp", y_digits=2, with_zero=True)
        order = np.argsort(term, kind="stable")
        self._bond_terms, self._bond_names = term[order], [names[row] for row in order.tolist()]
        self.set_range(x=(0.0, 1.05 * float(term.max())))
        used = fit.is_used[order]
        misfit = fit.residual_bp[order]
        self._put(Marks("Misfit", "ink", symbol="o"), 30).set(term[order][used], misfit[used])
        if used.all():
            self.remove("Left out")
        else:
            self._put(Marks("Left out", "ink_soft", symbol="x"), 30).set(term[order][~used], misfit[~used])
        self.set_description(words)

    def _only(self, *kept: str) -> None:
        self._bond_terms, self._bond_names = np.zeros(0), []
        for name in set(self.names) - set(kept):
            self.remove(name)

    def readings_at(self, x: float) -> list[tuple[str, str]]:
        """With the bonds' names."""
        found = super().readings_at(x)
        slack = 1e-9 * max(1.0, abs(x))
        first, stop = np.searchsorted(self._bond_terms, (x - slack, x + slack))
        names = self._bond_names[first:stop]
        return [(", ".join(names), ""), *found] if names else found


def _of_the_marks(quotes: Dots) -> str:
    """What rings and ticks are, after another sentence."""
    if quotes.on_curve is None:
        return ""
    without = ", without the liability spread" if quotes.spread else ""
    return f" Rings: bond yields as quoted; ticks: the same bonds' yields on the curve{without}."


def _sentence(shown: Shown, compounding: Compounding, until: float) -> str:
    """The curve in words: where it starts and ends, and how it goes on."""
    what = "Expected inflation" if shown.is_index else "Zero rates"
    last = shown.last_quoted
    if not np.isfinite(last):
        first = min(1.0, until)
        ends = shown.zero([first, until], compounding)
        if abs(ends[0] - ends[1]) < 1e-9:
            return f"One rate for every term, {numbers.rate(float(ends[0]), 2, with_unit=True)}."
        return f"{what} from {_at(shown, first, compounding)} to {_at(shown, until, compounding)}."
    start = float(shown.quotes.term.min()) if shown.quotes.term.size else min(1.0, last)
    if start < last:
        known = f"{what} from {_at(shown, start, compounding)} to {_at(shown, last, compounding)}"
    else:
        known = f"One rate, {_at(shown, last, compounding)}"
    if shown.ultimate is not None:
        goal = f"{numbers.rate(shown.ultimate, with_unit=True)}, compounded annually"
        return (
            f"{known}; beyond the last quote the forward rate goes to {goal}, at alpha "
            f"{numbers.number(shown.alpha, 6)}."
        )
    if shown.fit is not None and not shown.knots.size:
        end = from_continuous(shown.curve.forward(until, until), compounding)
        return (
            f"{known}; beyond the last bond the fitted formula goes on, to a forward rate of "
            f"{numbers.rate(float(end), with_unit=True)} at {numbers.integer(until)} years."
        )
    beyond = float(from_continuous(shown.curve.forward(last, last), compounding))
    source = "quote" if shown.fit is None else "bond"
    stays = numbers.rate(beyond, with_unit=True)
    return f"{known}; beyond the last {source} the forward rate stays at {stays}."


def _at(shown: Shown, term: float, compounding: Compounding) -> str:
    rate = numbers.rate(float(shown.zero(term, compounding)), 2, with_unit=True)
    if abs(term - round(term)) < 0.005:
        unit = "year" if round(term) == 1 else "years"
        return f"{rate} at {numbers.integer(term)} {unit}"
    return f"{rate} at {numbers.years(term)} years"
