"""A fitted model as a plain object for JSON and as plain-text tables."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable
from dataclasses import fields
from typing import Any

import numpy as np

from desk.book import Fault
from desk.rates.history_fit import HistoryFit
from desk.rates.kalman_fit import PanelFit
from desk.rates.option_calibration import VolatilityFit
from desk.report.as_json import fault_object
from desk.report.as_text import LINE_WIDTH, grouped, percent, printable, table
from desk.report.calibration_wording import INTERVALS, figure_wording, fit_title, residual_lines
from desk.report.plain_numbers import plain_number, plain_rows
from desk.report.wording import CAUTION
from desk.scenarios.calibration_records import Calibration, Figure

__all__ = ["calibration_object", "calibration_text"]

_TESTS = (
    *("ljung_box", "ljung_box_p", "squared_ljung_box", "squared_ljung_box_p", "skewness", "kurtosis"),
    *("jarque_bera", "jarque_bera_p", "kolmogorov", "kolmogorov_p"),
)


def calibration_object(found: Calibration, faults: Iterable[Fault] = ()) -> dict[str, Any]:
    """A fitted model.

    Parameters
    ----------
    found : Calibration
    faults : iterable of Fault
        Those of the reading.

    Returns
    -------
    dict
        ``source``, ``model``, ``is_poor``, ``verdict``, ``measure``, ``figures`` (list of ``name``,
        ``value``, ``standard_error``, ``low``, ``high``, ``derived``), ``log_likelihood``, ``observations``,
        ``rates_model`` (as the book would hold it; None where it cannot be used, which ``obstacle`` says),
        ``remarks``, ``faults``; by source ``profile``, ``steps`` and ``tests``, or ``instruments``, or
        ``terms`` and ``tests``. Rates a year and fractions; residuals of volatilities and yields in basis
        points.
    """
    plain: dict[str, Any] = {
        "source": found.source.value,
        "model": found.name.value,
        "is_poor": found.is_poor,
        "verdict": found.verdict,
        "measure": found.measure,
        "figures": [
            {
                "name": figure.name,
                "value": plain_number(figure.value),
                "standard_error": plain_number(figure.error),
                "low": plain_number(figure.low),
                "high": plain_number(figure.high),
                "derived": figure.is_derived,
            }
            for figure in found.figures
        ],
        "log_likelihood": plain_number(found.log_likelihood),
        "observations": found.observations,
        **_details(found),
    }
    if found.tests is not None:
        plain["tests"] = {name: plain_number(getattr(found.tests, name)) for name in _TESTS}
    plain["rates_model"] = None if found.model is None else _model_object(found)
    plain["obstacle"] = found.obstacle
    plain["remarks"] = list(found.remarks)
    plain["faults"] = [fault_object(fault) for fault in faults]
    return plain


def _model_object(found: Calibration) -> dict[str, Any]:
    """The items of the model that are stated."""
    assert found.model is not None
    stated: dict[str, Any] = {"name": found.model.name.value}
    for field in fields(found.model):
        value = getattr(found.model, field.name)
        if field.name != "name" and value is not None and not isinstance(value, bool):
            stated[field.name] = plain_number(value)
    return stated


def _details(found: Calibration) -> dict[str, Any]:
    """What each source has of its own."""
    fit = found.fit
    if isinstance(fit, VolatilityFit):
        rows = plain_rows(
            quoted=fit.quoted_volatility,
            model=fit.model_volatility,
            residual_bp=fit.residual_bp,
            quoted_price=fit.quoted_price,
            model_price=fit.model_price,
        )
        return {
            "instruments": [
                {"instrument": name, **row} for name, row in zip(fit.instruments, rows, strict=True)
            ],
            "rmse_bp": plain_number(fit.rmse_bp),
            "largest_bp": plain_number(fit.largest_bp),
        }
    if isinstance(fit, PanelFit):
        return {"terms": plain_rows(term=fit.term, rmse_bp=fit.rmse_bp)}
    plain: dict[str, Any] = {}
    if found.profile is not None:
        plain["profile"] = {
            "cut": plain_number(found.profile.cut),
            "points": plain_rows(
                mean_reversion=found.profile.mean_reversion, log_likelihood=found.profile.log_likelihood
            ),
        }
    if found.band is not None:
        rows = plain_rows(
            forecast=found.band.forecast, deviation=found.band.deviation, residual=found.residual
        )
        plain["steps"] = [{"date": str(date), **row} for date, row in zip(found.date[1:], rows, strict=True)]
    return plain


def calibration_text(found: Calibration, *, title: str = "") -> str:
    """A fitted model, as tables.

    Parameters
    ----------
    found : Calibration
    title : str
        Of the book.
    """
    head = f"{printable(title)}: " if title else ""
    rows = [_figure_row(found, figure) for figure in found.figures]
    parts = [
        f"{head}{fit_title(found)}",
        _wrapped(found.verdict),
        table(("Figure", "Unit", "Estimate", "Standard\nerror", "95 %\nfrom", "95 %\nto"), rows, left=2),
        f"Log-likelihood {grouped(found.log_likelihood, 4)} from {found.observations:,} observations.",
        _detail_table(found),
        _wrapped(found.measure),
    ]
    if found.obstacle:
        parts.append(_wrapped(found.obstacle))
    parts += [_wrapped(f"- {remark}", hang=True) for remark in found.remarks]
    parts += [_wrapped(INTERVALS), _wrapped(CAUTION)]
    return "\n\n".join(part for part in parts if part)


def _figure_row(found: Calibration, figure: Figure) -> tuple[str, ...]:
    wording = figure_wording(figure, found.name)
    write = percent if wording.is_rate else grouped
    figures = (figure.value, figure.error, figure.low, figure.high)
    return (wording.title, wording.unit, *(write(value, 4) for value in figures))


def _detail_table(found: Calibration) -> str:
    fit = found.fit
    if isinstance(fit, VolatilityFit):
        return table(
            ("Instrument", "Quoted\n%", "Model\n%", "Residual\nbp"),
            [
                (name, percent(quoted, 4), percent(model, 4), grouped(residual, 1))
                for name, quoted, model, residual in zip(
                    fit.instruments,
                    fit.quoted_volatility.tolist(),
                    fit.model_volatility.tolist(),
                    fit.residual_bp.tolist(),
                    strict=True,
                )
            ],
        )
    lines = ""
    if isinstance(fit, PanelFit):
        quoted = np.isfinite(fit.residual_bp).sum(axis=0)
        lines = table(
            ("Term\nyears", "Yields", "Residual, root\nmean square, bp"),
            [
                (f"{term:g}", f"{count:,}", grouped(rmse, 1))
                for term, count, rmse in zip(
                    fit.term.tolist(), quoted.tolist(), fit.rmse_bp.tolist(), strict=True
                )
            ],
            left=0,
        )
    assert isinstance(fit, HistoryFit | PanelFit)
    tests = table(
        ("Test of the residuals", "Figure", "Chance\n%"),
        [
            (
                line.name,
                grouped(line.figure, 3),
                "" if line.chance != line.chance else percent(line.chance, 2),
            )
            for line in residual_lines(fit.tests)
        ],
    )
    return f"{lines}\n\n{tests}" if lines else tests


def _wrapped(text: str, *, hang: bool = False) -> str:
    """A paragraph in lines."""
    return "\n".join(textwrap.wrap(text, LINE_WIDTH, subsequent_indent="  " if hang else ""))
