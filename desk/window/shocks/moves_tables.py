"""The tables of one shock: its moves, and what they do to the curve by term."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from typing import Any

from PySide6.QtCore import Qt, Signal
from PySide6.QtGui import QKeySequence, QShortcut

from desk.book import Move, MoveKind, Shock
from desk.window.parts.tables import Column, Table
from desk.window.parts.theme import ThemeSwitch
from desk.window.shocks.edits import move_fault, read_moves
from desk.window.shocks.moved import MovedRates
from desk.window.shocks.wording import KINDS, kind_named, shown_size, size_from

__all__ = ["MovesTable", "TermsTable"]

_MIXED = "in the unit"


class MovesTable(Table):
    """The moves of a shock; those of the user's own can be typed over and pasted.

    Attributes
    ----------
    shock : Shock or None

    Signals
    -------
    edited(str, object)
        What was done, and the moves that are to take the place of those shown.
    refused(str)
        What was not taken, and why.
    """

    edited = Signal(str, object)
    refused = Signal(str)

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        self._unit = ""
        super().__init__(
            self._make("bp", editable=True),
            theme_switch,
            name="Moves of the shock",
            description="All of them happen together. Insert adds one, Delete removes those selected; rows "
            "of move, size, term and what it applies to can be pasted.",
            empty_text="No moves yet. Insert adds one.",
        )
        self.shock: Shock | None = None
        self._is_own = False
        self.setSortingEnabled(False)
        self.table_model.refused.disconnect(self.message)
        self.table_model.refused.connect(self.refused)
        acts: tuple[tuple[Qt.Key, Callable[[], None]], ...] = (
            (Qt.Key.Key_Insert, self.add_move),
            (Qt.Key.Key_Delete, self.remove_moves),
        )
        for key, act in acts:
            shortcut = QShortcut(QKeySequence(key), self)
            shortcut.setContext(Qt.ShortcutContext.WidgetShortcut)
            shortcut.activated.connect(act)

    @staticmethod
    def _make(unit: str, *, editable: bool) -> tuple[Column, ...]:
        return (
            Column("kind", "Move", tooltip="What is moved.", editable=editable),
            Column(
                "size",
                "Size",
                unit,
                "number",
                digits=1,
                is_change=True,
                tooltip="Below 0 for down, or less.",
                editable=editable,
            ),
            Column("unit", "Unit", tooltip="Of the size."),
            Column(
                "term", "Term", "years", "years", digits=2, tooltip="Empty for all terms.", editable=editable
            ),
            Column(
                "target",
                "Applies to",
                tooltip="A holding, a kind of holding or a line; empty for all.",
                editable=editable,
            ),
        )

    def show_shock(self, shock: Shock | None, *, own: bool) -> None:
        """Show the moves of a shock."""
        units = {KINDS[move.kind].unit for move in shock.moves} if shock is not None else set()
        unit = units.pop() if len(units) == 1 else (_MIXED if units else "bp")
        if (unit, own) != (self._unit, self._is_own):
            self._unit, self._is_own = unit, own
            self.set_columns(self._make(unit, editable=own))
        self.shock = shock
        self.table_model.commit = self._commit if own else None
        self.paste_callback = self._on_paste if own else None
        moves = shock.moves if shock is not None else ()
        self.set_rows(
            {
                "kind": [KINDS[move.kind].name for move in moves],
                "size": [shown_size(move) for move in moves],
                "unit": [KINDS[move.kind].unit for move in moves],
                "term": [move.term for move in moves],
                "target": [move.target for move in moves],
            }
        )
        self.fit_columns()
        self.setColumnHidden(self.table_model.column_of("unit"), unit != _MIXED)

    @property
    def moves(self) -> tuple[Move, ...]:
        """Those shown."""
        return self.shock.moves if self.shock is not None else ()

    # Editing

    def _put(self, text: str, moves: tuple[Move, ...]) -> None:
        self.edited.emit(text, moves)

    def put_move(self, row: int, move: Move, what: str) -> str:
        """Put another move in a row; why not, or nothing."""
        fault = move_fault(move)
        if fault:
            return fault
        self._put(f"Change of {what}", (*self.moves[:row], move, *self.moves[row + 1 :]))
        return ""

    def with_kind(self, row: int, kind: MoveKind) -> Move:
        """The move of a row as another kind, with what still makes sense of it."""
        move, words = self.moves[row], KINDS[kind]
        former = KINDS[move.kind]
        size = move.size
        if words.unit != former.unit:
            size = size_from(kind, -10.0 if words.factor != 1.0 else 100.0 if words.unit == "bp" else 1.0)
        term = move.term if words.needs_term or words.may_have_term else None
        if words.needs_term and not term:
            term = 10.0
        return Move(kind, size, term, move.target if words.targets == former.targets else "")

    def _commit(self, row: int, key: str, value: Any) -> str | None:
        move = self.moves[row]
        if key == "kind":
            kind = kind_named(str(value))
            if kind is None:
                names = ", ".join(words.name for words in KINDS.values())
                return f"“{value}” is no kind of move. There are: {names}."
            return self.put_move(row, self.with_kind(row, kind), "a kind of move") or None
        if key == "size":
            if value is None:
                return "A move needs a size."
            changed = replace(move, size=size_from(move.kind, float(value)))
        elif key == "term":
            if value is not None and value < 0.0:
                return "A term must be at least 0 years."
            changed = replace(move, term=None if value is None else float(value))
        else:
            changed = replace(move, target=str(value or "").strip())
        return (
            self.put_move(
                row, changed, {"size": "a size", "term": "a term"}.get(key, "what a move applies to")
            )
            or None
        )

    def add_move(self) -> None:
        """Add a move after the selected one, of its kind."""
        if not self._is_own or self.shock is None:
            self.refused.emit("Only a shock of your own can be changed: make a copy of this one.")
            return
        row = self.current_source_row()
        after = row if row >= 0 else len(self.moves) - 1
        if after >= 0:
            move = self.moves[after]
            if move.term is not None:
                terms = [each.term for each in self.moves if each.kind is move.kind and each.term is not None]
                move = replace(move, term=max(terms) + 5.0)
        else:
            move = Move(MoveKind.PARALLEL, -100.0)
        self._put("New move", (*self.moves[: after + 1], move, *self.moves[after + 1 :]))
        self.go_to(after + 1)

    def remove_moves(self) -> None:
        """Remove the moves that are selected."""
        if not self._is_own:
            self.refused.emit("Only a shock of your own can be changed: make a copy of this one.")
            return
        chosen = {index.row() for index in self.selectionModel().selectedIndexes()}
        if not chosen:
            self.refused.emit("Select the moves to remove.")
            return
        kept = tuple(move for row, move in enumerate(self.moves) if row not in chosen)
        self._put("Removal of moves", kept)

    def _on_paste(self, row: int, _key: str, grid: list[list[str]]) -> str | None:
        pasted = read_moves(grid)
        if pasted.fault:
            self.refused.emit(f"Nothing was pasted. {pasted.fault}")
            return None
        everything = len(self.selectionModel().selectedRows()) == len(self.moves)
        start = 0 if everything or row < 0 else row
        rest = () if everything else self.moves[start + len(pasted.moves) :]
        self._put("Pasted moves", (*self.moves[:start], *pasted.moves, *rest))
        return None


class TermsTable(Table):
    """Zero rates before and after, at the key terms."""

    def __init__(self, theme_switch: ThemeSwitch) -> None:
        super().__init__(
            (
                Column("term", "Term", "years", "years", digits=2),
                Column(
                    "move", "Move", "bp", "number", digits=1, is_change=True, tooltip="After less before."
                ),
                Column("before", "Before", "% a year", "rate", digits=3, tooltip="Continuous zero rate."),
                Column("after", "After", "% a year", "rate", digits=3, tooltip="Continuous zero rate."),
            ),
            theme_switch,
            name="The curve by term, before and after",
            empty_text="Nothing moves the curve.",
        )

    def show_rates(self, rates: MovedRates | None) -> None:
        """Show rates."""
        self.set_rows(
            {"term": (), "move": (), "before": (), "after": ()}
            if rates is None
            else {
                "term": rates.term,
                "move": rates.term_move_bp,
                "before": rates.term_before,
                "after": rates.term_after,
            }
        )
