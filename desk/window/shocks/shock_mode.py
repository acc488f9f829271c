"""The mode One shock: what it moves, by term, and the moved curve; the user's own are changed here."""

from __future__ import annotations

from dataclasses import replace
from html import escape
from typing import TYPE_CHECKING

from PySide6.QtCore import Qt
from PySide6.QtWidgets import QSplitter, QWidget

from desk.book import Book, Shock
from desk.rates.compounding import Compounding
from desk.valuation.shock_records import ShockResult
from desk.window.parts import numbers
from desk.window.parts.fields import Choice, ChoiceField, TextField
from desk.window.parts.labels import well_broken
from desk.window.parts.theme import GAP
from desk.window.shocks.curve_pictures import MovedCurvePicture, MovePicture
from desk.window.shocks.edits import name_fault, own_copy, shock_fault, with_added, with_shock, without_shock
from desk.window.shocks.mode import Mode
from desk.window.shocks.moved import MovedRates, moved_rates
from desk.window.shocks.moves_tables import MovesTable, TermsTable
from desk.window.shocks.wording import KINDS, in_short, short, targets_of, verdict_of
from desk.window.standing.wording import amount

if TYPE_CHECKING:
    from desk.window.shocks.station import ShocksStation

__all__ = ["ShockMode"]

_LONGEST = 48
_COMPOUNDINGS = tuple(Choice(each, each.value) for each in Compounding)


class ShockMode(Mode):
    """One shock."""

    key = "shock"
    title = "One shock"
    purpose = "What a shock moves, and the moved curve"
    share = 46

    def __init__(self, station: ShocksStation) -> None:
        super().__init__(station)
        self._place = -1
        self.curve = MovedCurvePicture(self.theme_switch)
        self.move = MovePicture(self.theme_switch)
        self.pictures = (self.curve, self.move)
        self.moves = MovesTable(self.theme_switch)
        self.terms = TermsTable(self.theme_switch)
        split = QSplitter(Qt.Orientation.Horizontal)
        split.setChildrenCollapsible(False)
        split.setHandleWidth(GAP)
        for table, share in ((self.moves, 3), (self.terms, 2)):
            split.addWidget(table)
            split.setStretchFactor(split.count() - 1, share)
        split.setSizes([600, 400])
        self.table = split
        for teller in (*self.pictures, self.moves, self.terms):
            teller.message.connect(station.message)
        self.moves.edited.connect(self._put_moves)
        self.moves.refused.connect(self.refuse)
        self.moves.current_row_changed.connect(lambda _: self._show_move())
        self._make_form()

    def _make_form(self) -> None:
        form = self.form
        self.which = ChoiceField("Shock", ())
        self.which.combo.setSizeAdjustPolicy(
            self.which.combo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon
        )
        self.which.combo.setMinimumContentsLength(12)
        self.which.committed.connect(self._choose)
        form.add(self.which)
        self.name = TextField("Name", check=self._check_name)
        self.name.committed.connect(self._rename)
        form.add(self.name)
        self.source_field = TextField("Source", hint="Where it comes from, for reports; it may stay empty.")
        self.source_field.committed.connect(self._change_source)
        form.add(self.source_field)
        self.source_note = form.add_note("")
        self.source_note.setTextFormat(Qt.TextFormat.PlainText)
        self.move_heading = form.add_heading("The selected move")
        self.kind = ChoiceField(
            "Moves", [Choice(kind, words.name, words.explanation) for kind, words in KINDS.items()]
        )
        self.kind.committed.connect(self._change_kind)
        self.target = ChoiceField("Applies to", (Choice("", "All"),))
        self.target.combo.setSizeAdjustPolicy(
            self.which.combo.SizeAdjustPolicy.AdjustToMinimumContentsLengthWithIcon
        )
        self.target.combo.setMinimumContentsLength(12)
        self.target.committed.connect(self._change_target)
        form.add(self.kind)
        form.add(self.target)
        self.add_button = form.add_button("Add a move", self.moves.add_move)
        self.add_button.setToolTip("After the selected one (Insert in the table)")
        self.remove_button = form.add_button("Remove the selected moves", self.moves.remove_moves)
        self.remove_button.setToolTip("Delete in the table")
        self.shock_heading = form.add_heading("The whole shock")
        self.compounding = ChoiceField(
            "Moves rates that are compounded",
            _COMPOUNDINGS,
            hint="A rule that moves annual rates is met exactly on annual rates.",
        )
        self.compounding.committed.connect(self._change_compounding)
        form.add(self.compounding)
        self.copy_button = form.add_button("Copy as my own", self.copy)
        self.delete_button = form.add_button("Delete this shock", self.delete)

    # What there is

    def shocks(self) -> tuple[Shock, ...]:
        """The book's own, then those of the sets."""
        book, table = self.document.book, self.document.shocks.result
        own = book.shocks if book is not None else ()
        results = table.results if table is not None else ()
        return (*own, *(result.shock for result in results if result.set_name))

    def _current(self, book: Book) -> Shock | None:
        """The shock to show: the one selected, as the book has it now."""
        wanted, there = self.station.selected, self.shocks()
        if wanted is not None and wanted.set_name:
            self._place = -1
            return next((each for each in there if _is_same(each, wanted)), there[0] if there else None)
        if wanted is not None:
            for place, each in enumerate(book.shocks):
                if each.name == wanted.name:
                    self._place = place
                    return each
            # It was renamed, by undo for example: what stands in its place now is the same.
            if 0 <= self._place < len(book.shocks):
                return book.shocks[self._place]
        self._place = 0 if book.shocks else -1
        return there[0] if there else None

    def _result(self, shock: Shock | None) -> ShockResult | None:
        table = self.document.shocks.result
        if shock is None or table is None:
            return None
        return next((each for each in table.results if each.shock == shock), None)

    # Showing

    def show_book(self, book: Book) -> None:
        """Show the selected shock."""
        shock = self._current(book)
        self.station.selected = shock
        own = shock is not None and not shock.set_name
        there = self.shocks()
        self.which.set_choices([Choice(place, _titled(each), "") for place, each in enumerate(there)])
        at = next((place for place, each in enumerate(there) if each is shock), None)
        self.which.set_value(at)
        self.which.set_hint("" if shock is None else f"Moves {in_short(shock)}.")
        self.which.combo.setToolTip("" if shock is None else f"<qt>{escape(shock.name)}</qt>")
        for widget in (self.name, self.source_field, self.add_button, self.remove_button):
            widget.setVisible(own)
        self.delete_button.setVisible(own)
        self.copy_button.setEnabled(shock is not None)
        self.compounding.setEnabled(own)
        self.source_note.setVisible(not own)
        if shock is not None:
            _set(self.name, shock.name)
            _set(self.source_field, shock.source)
            self.compounding.set_value(shock.compounding)
            self.source_note.setText(
                well_broken(f"{shock.set_name}: {shock.source}. To change it, copy it as your own.")
            )
        self.moves.show_shock(shock, own=own)
        self._show_move()
        rates: MovedRates = moved_rates(book, shock)
        self.curve.show_rates(rates)
        self.move.show_rates(rates)
        self.terms.show_rates(rates)

    def _show_move(self) -> None:
        """Show the selected move in the form."""
        book, shock = self.document.book, self.moves.shock
        row = self.moves.current_source_row()
        own = shock is not None and not shock.set_name
        there = own and shock is not None and bool(shock.moves)
        for widget in (self.move_heading, self.kind, self.target):
            widget.setVisible(bool(there))
        if not there or shock is None or book is None:
            return
        move = shock.moves[row if 0 <= row < len(shock.moves) else 0]
        self.kind.set_value(move.kind)
        targets = targets_of(book, move.kind)
        if move.target and move.target not in targets:
            targets = (*targets, move.target)
        self.target.setVisible(bool(KINDS[move.kind].targets))
        self.target.set_choices([Choice("", "All"), *(Choice(each, _cut(each)) for each in targets)])
        self.target.set_value(move.target)

    def words(self) -> str:
        """What the shock does to the surplus."""
        shock, table = self.station.selected, self.document.shocks.result
        if shock is None or table is None:
            return "There is no shock to show. Add one of your own among all shocks."
        result = self._result(shock)
        fault = shock_fault(shock)
        if result is None:
            waits = self.document.shocks.is_running
            return fault or ("" if waits else f"“{short(shock.name)}” could not be computed.")
        change = result.change_in_surplus
        verb = "adds" if change >= 0.0 else "takes"
        end = "to the surplus" if change >= 0.0 else "off the surplus"
        size = amount(abs(change), table.currency)
        estimate = amount(abs(result.estimated_change_in_surplus), table.currency)
        verdict = verdict_of(result.funding_ratio, result.band, table.thresholds)
        ratio = numbers.ratio(result.funding_ratio)
        head = f"“{short(shock.name)}” {verb} {size} {end} (estimated {estimate})"
        return f"{head}: funding ratio {ratio}, {verdict}."

    def home(self) -> QWidget:
        """The moves."""
        return self.moves

    # Editing

    def _choose(self, place: int) -> None:
        there = self.shocks()
        if 0 <= place < len(there):
            self._place = place if not there[place].set_name else -1
            self.station.open_shock(there[place])

    def _put(self, text: str, **changes: object) -> None:
        """Change the shock shown, which is the user's own."""
        book, shock = self.document.book, self.moves.shock
        if book is None or shock is None or shock.set_name or not 0 <= self._place < len(book.shocks):
            return
        changed = replace(shock, **changes)  # type: ignore[arg-type]  # fields of Shock, by name
        self.station.selected = changed
        self.edit(text, with_shock(book, self._place, changed))
        self.station.refresh_shown()

    def _put_moves(self, text: str, moves: tuple[object, ...]) -> None:
        shock = self.moves.shock
        if shock is None:
            return
        changed = replace(shock, moves=moves)  # type: ignore[arg-type]  # moves, through a signal
        fault = shock_fault(changed)
        if fault:
            self.refuse(f"{fault} The shock is unchanged.")
            return
        self._put(f"{text} of the shock {shock.name}", moves=moves)

    def _check_name(self, text: str) -> str:
        book = self.document.book
        return "" if book is None else name_fault(book, text, but=self._place)

    def _rename(self, name: str) -> None:
        shock = self.moves.shock
        if shock is not None:
            self._put(f"New name of the shock {shock.name}", name=name.strip())

    def _change_source(self, source: str) -> None:
        shock = self.moves.shock
        if shock is not None:
            self._put(f"Change of the source of the shock {shock.name}", source=source.strip())

    def _change_compounding(self, compounding: Compounding) -> None:
        shock = self.moves.shock
        if shock is not None:
            self._put(f"Change of the compounding of the shock {shock.name}", compounding=compounding)

    def _row(self) -> int:
        row = self.moves.current_source_row()
        return row if 0 <= row < len(self.moves.moves) else 0

    def _change_kind(self, kind: object) -> None:
        row = self._row()
        if row < len(self.moves.moves):
            self._said(self.moves.put_move(row, self.moves.with_kind(row, kind), "a kind of move"))  # type: ignore[arg-type]  # a MoveKind, through a signal

    def _change_target(self, target: str) -> None:
        row = self._row()
        if row < len(self.moves.moves):
            move = replace(self.moves.moves[row], target=target)
            self._said(self.moves.put_move(row, move, "what a move applies to"))

    def _said(self, fault: str) -> None:
        if fault:
            self.refuse(f"{fault} The shock is unchanged.")
            self._show_move()

    def copy(self) -> None:
        """Copy the shock shown as one of the user's own."""
        book, shock = self.document.book, self.moves.shock
        if book is None or shock is None:
            return
        copy = own_copy(book, shock)
        self._place = len(book.shocks)
        self.station.selected = copy
        self.edit(f"Copy of the shock {shock.name}", with_added(book, copy))
        self.station.refresh_shown()

    def delete(self) -> None:
        """Delete the shock shown."""
        book, shock = self.document.book, self.moves.shock
        if book is None or shock is None or shock.set_name or not 0 <= self._place < len(book.shocks):
            return
        self.edit(f"Deletion of the shock {shock.name}", without_shock(book, self._place))
        self.station.show_mode("table")


def _is_same(one: Shock, other: Shock) -> bool:
    return (one.name, one.set_name) == (other.name, other.set_name)


def _cut(text: str) -> str:
    return text if len(text) <= _LONGEST else f"{text[: _LONGEST - 1]}…"


def _titled(shock: Shock) -> str:
    return _cut(f"{shock.name} ({shock.set_name})" if shock.set_name else shock.name)


def _set(field: TextField, value: str) -> None:
    """Show a value, but leave an entry alone that the reader has yet to finish."""
    if not (field.line.hasFocus() and field.line.isModified()):
        field.set_value(value)
