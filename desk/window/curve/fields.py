"""The form of the station Curve: for every way to state a curve the fields that matter to it."""

from __future__ import annotations

from collections.abc import Callable

from PySide6.QtCore import QObject, Signal
from PySide6.QtWidgets import QWidget

from desk.book import Basis, BondFit, CurveKind, CurveParameters, LiabilityMethod
from desk.rates.curve import Interpolation
from desk.rates.smith_wilson import Extrapolation
from desk.window.curve.faults import QUOTED_KINDS
from desk.window.curve.parameter_fields import ParameterFields, flat_rate_field
from desk.window.curve.targets import Part
from desk.window.curve.words import (
    BOND_FITS,
    COMPOUNDINGS,
    CURVE_KINDS,
    DAY_COUNTS,
    EXTRAPOLATIONS,
    INTERPOLATIONS,
    LIABILITY_METHODS,
    PAYMENTS,
)
from desk.window.parts.fields import ChoiceField, Field, Form, NumberField
from desk.window.parts.premiums import liability_spread_field, market_risk_premium_field

__all__ = ["CurveFields"]

_FORMULAS = (CurveKind.NELSON_SIEGEL, CurveKind.SVENSSON)


class CurveFields(QObject):
    """The fields of a basis, each shown where it matters.

    Signals
    -------
    changed(str, object, str)
        A field of the basis: its name, the value entered, and what it is called.
    kind_chosen(object), method_chosen(object)
        Another kind of curve, or another way to discount liabilities.
    inflation_changed(str, object, str)
        Likewise a field of the expected inflation.
    day_count_chosen(object)
    """

    changed = Signal(str, object, str)
    kind_chosen = Signal(object)
    method_chosen = Signal(object)
    inflation_changed = Signal(str, object, str)
    day_count_chosen = Signal(object)

    def __init__(self, form: Form) -> None:
        super().__init__(form)
        self._form = form
        self._rules: list[tuple[QWidget, Callable[[Basis, Part], bool]]] = []
        self._make_curve()
        self._make_beyond()
        self._make_liabilities()
        self._make_inflation()
        self._make_added()
        self._note = form.add_note("")
        form.add_heading("Time")
        self.day_count = ChoiceField(
            "Day count", DAY_COUNTS, hint="Turns dates into years, for both bases of a book."
        )
        form.add(self.day_count)
        self.day_count.committed.connect(self.day_count_chosen)

    # Making it

    def _heading(self, text: str, rule: Callable[[Basis, Part], bool]) -> None:
        self._rules.append((self._form.add_heading(text), rule))

    def _add(self, field: Field, rule: Callable[[Basis, Part], bool]) -> None:
        self._form.add(field)
        self._rules.append((field, rule))

    def _tell(self, field: Field, name: str, what: str) -> None:
        field.committed.connect(lambda value: self.changed.emit(name, value, what))

    def _make_curve(self) -> None:
        self._heading("The curve", _is_curve)
        self.curve_kind = ChoiceField("Stated by", CURVE_KINDS)
        self.payments = ChoiceField("Payments a year", PAYMENTS)
        self.compounding = ChoiceField(
            "Rates are stated", COMPOUNDINGS, hint="The figures stay; what they mean changes."
        )
        self.bond_fit = ChoiceField("Through the bonds", BOND_FITS)
        self.interpolation = ChoiceField("Between the quotes", INTERPOLATIONS)
        self.flat_rate = flat_rate_field()
        self.parameters = ParameterFields()
        self._add(self.curve_kind, _is_curve)
        self._add(self.payments, _of_kinds(CurveKind.PAR, CurveKind.SWAP))
        self._add(self.compounding, _states_compounding)
        self._add(self.bond_fit, _fits_bonds)
        self._add(self.flat_rate, _of_kinds(CurveKind.FLAT))
        for name, field in self.parameters.fields.items():
            kinds = (CurveKind.SVENSSON,) if name in ("beta_3", "tau_2") else _FORMULAS
            self._add(field, _of_kinds(*kinds))
        self._add(self.interpolation, _interpolates)
        self.curve_kind.committed.connect(self.kind_chosen)
        self._tell(self.payments, "payments_per_year", "payments a year")
        self._tell(self.compounding, "compounding", "compounding of the rates")
        self._tell(self.bond_fit, "bond_fit", "fit of the bonds")
        self._tell(self.interpolation, "interpolation", "interpolation")
        self._tell(self.flat_rate, "flat_rate", "flat rate")
        self.parameters.changed.connect(lambda value, what: self.changed.emit("parameters", value, what))

    def _make_beyond(self) -> None:
        self._heading("Beyond the last quote", _has_quotes)
        self.extrapolation = ChoiceField("How the curve goes on", EXTRAPOLATIONS)
        self.last_liquid_point = NumberField(
            "Last liquid point",
            unit="years",
            low=0.01,
            high=150.0,
            sensible=(10.0, 50.0),
            hint="Quotes beyond it are left out; empty for the last quote.",
            optional=True,
        )
        self.ultimate_forward_rate = NumberField(
            "Ultimate forward rate",
            unit="% a year",
            percent=True,
            low=-0.05,
            high=0.2,
            sensible=(0.02, 0.06),
            hint="Compounded once a year; for Smith-Wilson.",
            optional=True,
        )
        self.convergence_point = NumberField(
            "Convergence point",
            unit="years",
            low=1.0,
            high=300.0,
            sensible=(40.0, 100.0),
            hint="Where the forward rate has come to it; empty for 40 years after the last liquid point, "
            "but no earlier than 60 years.",
            optional=True,
        )
        self.tolerance = NumberField(
            "Convergence tolerance",
            unit="% a year",
            percent=True,
            high=0.01,
            sensible=(1e-5, 1e-3),
            hint="How far the forward rate may still be from the ultimate one there.",
        )
        self._add(self.extrapolation, _is_drawn_through)
        self._add(self.last_liquid_point, _has_quotes)
        self._add(self.ultimate_forward_rate, _is_drawn_through)
        self._add(self.convergence_point, _by_method)
        self._add(self.tolerance, _by_method)
        for field, name, what in (
            (self.extrapolation, "extrapolation", "curve beyond the last quote"),
            (self.last_liquid_point, "last_liquid_point", "last liquid point"),
            (self.ultimate_forward_rate, "ultimate_forward_rate", "ultimate forward rate"),
            (self.convergence_point, "convergence_point", "convergence point"),
            (self.tolerance, "convergence_tolerance", "convergence tolerance"),
        ):
            self._tell(field, name, what)

    def _make_liabilities(self) -> None:
        self._heading("The liabilities", _is_liabilities)
        self.method = ChoiceField("Discounted on", LIABILITY_METHODS)
        self.liability_fit = ChoiceField("Through the bonds", BOND_FITS)
        self.expected_return = NumberField(
            "Expected return",
            unit="% a year",
            percent=True,
            low=-0.5,
            high=1.0,
            sensible=(0.01, 0.08),
            hint="On the assets, compounded once a year.",
        )
        self._add(self.method, _is_liabilities)
        self._add(self.liability_fit, _by_liability_method(LiabilityMethod.CORPORATE_BONDS))
        self._add(self.expected_return, _by_liability_method(LiabilityMethod.EXPECTED_RETURN))
        self.method.committed.connect(self.method_chosen)
        self._tell(self.liability_fit, "liability_fit", "fit of the corporate bonds")
        self._tell(self.expected_return, "expected_return", "expected return")

    def _make_inflation(self) -> None:
        self._heading("Expected inflation", _is_inflation)
        self.inflation_interpolation = ChoiceField("Between the quotes", INTERPOLATIONS)
        self.volatility = NumberField(
            "Volatility of inflation",
            unit="% a year",
            percent=True,
            low=0.0,
            high=0.2,
            sensible=(0.005, 0.03),
            hint="Standard deviation of one year's inflation; for lines with a floor or a cap.",
        )
        self.recent = NumberField(
            "Recent inflation",
            unit="% a year",
            percent=True,
            low=-0.3,
            high=2.0,
            sensible=(-0.02, 0.12),
            hint="Of the months just passed, which a lagged index has yet to follow; empty for the start of "
            "the curve.",
            optional=True,
        )
        for field, name, what in (
            (self.inflation_interpolation, "interpolation", "interpolation of inflation"),
            (self.volatility, "volatility", "volatility of inflation"),
            (self.recent, "recent", "recent inflation"),
        ):
            self._add(field, _has_inflation)
            field.committed.connect(
                lambda value, name=name, what=what: self.inflation_changed.emit(name, value, what)
            )

    def _make_added(self) -> None:
        self._heading("Added to the curve", _not_inflation)
        self.liability_spread = liability_spread_field()
        self.market_risk_premium = market_risk_premium_field()
        for field, name, what in (
            (self.liability_spread, "liability_spread", "liability spread"),
            (self.market_risk_premium, "market_risk_premium", "market risk premium"),
        ):
            self._add(field, _not_inflation)
            self._tell(field, name, what)

    # Showing

    def show_basis(self, basis: Basis, part: Part, note: str = "") -> None:
        """Show a basis, with the fields that matter to one of its curves; `note` stands under them."""
        self.curve_kind.set_value(basis.curve_kind)
        self.payments.set_value(basis.payments_per_year)
        self.compounding.set_value(basis.compounding)
        self.bond_fit.set_value(basis.bond_fit)
        self.interpolation.set_value(basis.interpolation)
        self.flat_rate.set_value(basis.flat_rate)
        self.parameters.show_parameters(basis.parameters or CurveParameters(0.0, 0.0, 0.0, 1.0))
        self.extrapolation.set_value(basis.extrapolation)
        self.last_liquid_point.set_value(basis.last_liquid_point)
        self.ultimate_forward_rate.set_value(basis.ultimate_forward_rate)
        self.convergence_point.set_value(basis.convergence_point)
        self.tolerance.set_value(basis.convergence_tolerance)
        self.method.set_value(basis.liability_method)
        self.liability_fit.set_value(basis.liability_fit)
        self.expected_return.set_value(basis.expected_return)
        self.liability_spread.set_value(basis.liability_spread)
        self.market_risk_premium.set_value(basis.market_risk_premium)
        self.day_count.set_value(basis.day_count)
        inflation = basis.inflation
        if inflation is not None:
            self.inflation_interpolation.set_value(inflation.interpolation)
            self.volatility.set_value(inflation.volatility)
            self.recent.set_value(inflation.recent)
        else:
            self.inflation_interpolation.set_value(Interpolation.LOG_LINEAR)
        for widget, rule in self._rules:
            widget.setVisible(rule(basis, part))
        self._note.setText(note)
        self._note.setVisible(bool(note))


def _is_curve(_basis: Basis, part: Part) -> bool:
    return part is Part.CURVE


def _is_liabilities(_basis: Basis, part: Part) -> bool:
    return part is Part.LIABILITIES


def _is_inflation(_basis: Basis, part: Part) -> bool:
    return part is Part.INFLATION


def _not_inflation(_basis: Basis, part: Part) -> bool:
    return part is not Part.INFLATION


def _has_inflation(basis: Basis, part: Part) -> bool:
    return part is Part.INFLATION and basis.inflation is not None


def _of_kinds(*kinds: CurveKind) -> Callable[[Basis, Part], bool]:
    return lambda basis, part: part is Part.CURVE and basis.curve_kind in kinds


def _by_liability_method(method: LiabilityMethod) -> Callable[[Basis, Part], bool]:
    return lambda basis, part: part is Part.LIABILITIES and basis.liability_method is method


def _states_compounding(basis: Basis, part: Part) -> bool:
    return part is Part.CURVE and basis.curve_kind is not CurveKind.BONDS


def _fits_bonds(basis: Basis, part: Part) -> bool:
    """Smith-Wilson reprices every bond, so that there is no fit to choose."""
    return (
        part is Part.CURVE
        and basis.curve_kind is CurveKind.BONDS
        and basis.extrapolation is not Extrapolation.SMITH_WILSON
    )


def _is_drawn_through(basis: Basis, part: Part) -> bool:
    """Whether the curve is drawn from one quote to the next, and so needs to be told how it goes on."""
    if part is not Part.CURVE:
        return False
    if basis.curve_kind is CurveKind.BONDS:
        return basis.bond_fit is BondFit.EXACT or basis.extrapolation is Extrapolation.SMITH_WILSON
    return basis.curve_kind in QUOTED_KINDS


def _has_quotes(basis: Basis, part: Part) -> bool:
    return part is Part.CURVE and basis.curve_kind in (*QUOTED_KINDS, CurveKind.BONDS)


def _by_method(basis: Basis, part: Part) -> bool:
    return _is_drawn_through(basis, part) and basis.extrapolation is Extrapolation.SMITH_WILSON


def _interpolates(basis: Basis, part: Part) -> bool:
    if part is Part.LIABILITIES:
        bonds = basis.liability_method is LiabilityMethod.CORPORATE_BONDS
        return bonds and basis.liability_fit is BondFit.EXACT
    return _is_drawn_through(basis, part) and basis.extrapolation is not Extrapolation.SMITH_WILSON
