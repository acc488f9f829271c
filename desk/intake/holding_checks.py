"""What a row of the sheet of holdings must and may hold, and the checks of it."""

from __future__ import annotations

from datetime import date

import numpy as np
from numpy.typing import NDArray

from desk.book import Amortisation, HoldingKind
from desk.book.holding import COUPON_FREQUENCIES, SWAP_KINDS
from desk.intake.cells import Cells
from desk.intake.checks import check_rates, check_size
from desk.intake.columns import Kind
from desk.intake.faults import FaultList
from desk.intake.holding_columns import (
    FLOATER,
    LEFT_OUT,
    LINKED,
    SAYS_NOTHING,
    USED,
    USUAL,
    WITH_SPREAD,
    KindMasks,
    YesNo,
)
from desk.intake.layout import Table, fold

__all__ = [
    "check_annuities",
    "check_dates",
    "check_ex_dividend",
    "check_indexation",
    "check_numbers",
    "check_prices",
    "check_worth",
    "report_missing_columns",
    "report_past",
    "report_twice",
    "report_unused",
]

BoolArray = NDArray[np.bool_]
FloatArray = NDArray[np.float64]
DayArray = NDArray[np.datetime64]


_MOST_LAG_MONTHS = 60
_MOST_EX_DAYS = 300
_LOW_PRICE = 2.0
"""A price per 100 below this is rather a price per 1."""
_CORRECT = "Correct the figure."


def report_missing_columns(
    table: Table, kinds: list[HoldingKind | None], needed: dict[str, BoolArray], faults: FaultList
) -> None:
    """Some kinds need a column that the sheet may do without."""
    for heading in ("Market value", "Start date"):
        if table.column(heading) is not None:
            continue
        for entry in np.flatnonzero(needed[heading]).tolist():
            faults.add(
                f"the {kinds[entry]} has no {heading.lower()}",
                f"a {heading.lower()}",
                f'Add the column "{heading}" and fill it.',
                sheet=table.sheet.name,
                row=int(table.rows[entry]),
                column=table.fields.get("Name", 0),
            )


def check_numbers(cells: dict[str, Cells], numbers: dict[str, FloatArray], kinds: KindMasks) -> None:
    """Report numbers that can only be slips."""
    for name in ("Coupon", "Discount rate", "Current rate", "Margin"):
        check_rates(cells[name], numbers[name], f"the {name.lower()}")
    check_size(cells["Nominal"], numbers["Nominal"], "the nominal")
    check_size(cells["Market value"], numbers["Market value"], "the market value")
    check_size(cells["Units"], numbers["Units"], "the number of units")
    check_size(cells["Price"], numbers["Price"], "the price", most=1e6)
    for name, what in (("Frequency", "coupons"), ("Floating frequency", "payments")):
        odd = ~np.isnan(numbers[name]) & ~np.isin(numbers[name], COUPON_FREQUENCIES)
        cells[name].each(odd, f"the {name.lower()} is {{}}", f"1, 2, 4 or 12 {what} a year", _CORRECT)
    nominal, duration = numbers["Nominal"], numbers["Duration"]
    default, recovery = numbers["Default rate"], numbers["Recovery rate"]
    with np.errstate(invalid="ignore"):
        unlikely = (duration < 0.0) | (duration > 100.0)
        negative = nominal < 0.0
        no_default = ((default < 0.0) | (default >= 1.0)) & kinds.among(USED["Default rate"])
        no_recovery = (recovery < 0.0) | (recovery > 1.0)
    cells["Duration"].each(unlikely, "the duration is {}", "a duration from 0 to 100 years", _CORRECT)
    is_swap = kinds.among(SWAP_KINDS)
    for flagged, mend in (
        (negative & ~is_swap, "It counts as a debt; correct the sign if it is held."),
        (negative & is_swap, "It turns the swap round; write the other kind of swap, or correct the sign."),
    ):
        cells["Nominal"].each(flagged, "the nominal is {}", "an amount of at least 0", mend, mild=True)
    for name, flagged, limits in (
        ("Default rate", no_default, "from 0 to below 1"),
        ("Recovery rate", no_recovery, "from 0 to 1"),
    ):
        cells[name].each(
            flagged,
            f"the {name.lower()} is {{}}",
            f"a {name.lower()} {limits}, as a fraction or in a cell formatted as per cent",
            "Correct the figure; 2 per cent is 2 % or 0.02.",
        )


def report_past(
    cells: dict[str, Cells], maturity: DayArray, has_maturity: BoolArray, valuation_date: date | None
) -> BoolArray:
    """Report holdings that have matured; which they are."""
    if valuation_date is None:
        return np.zeros(maturity.size, dtype=np.bool_)
    past = np.asarray(~np.isnat(maturity) & (maturity <= np.datetime64(valuation_date, "D")))
    matured = np.flatnonzero(past & has_maturity)
    cells["Maturity"].each_with(
        matured,
        (
            f"the holding matured on {day}, not after the valuation date {valuation_date}"
            for day in np.datetime_as_string(maturity[matured]).tolist()
        ),
        "a date after the valuation date",
        "It is kept and counts for nothing; remove it or correct the date.",
        mild=True,
    )
    return past


def check_worth(
    cells: dict[str, Cells], numbers: dict[str, FloatArray], kinds: KindMasks, past: BoolArray
) -> None:
    """Report market values that no spread gives."""
    nominal, value = numbers["Nominal"], numbers["Market value"]
    with np.errstate(invalid="ignore"):
        apart = ~np.isnan(value) & (np.sign(nominal) * value <= 0.0) & (nominal != 0.0) & ~past
    cells["Market value"].each(
        apart & kinds.among(WITH_SPREAD),
        "the market value is {}, which no spread gives for this nominal",
        "a market value above 0 for a holding, below 0 for a debt",
        "Correct it, or leave it empty.",
    )
    cells["Market value"].each(
        ~np.isnan(value) & kinds.among(SWAP_KINDS),
        "the market value of a swap is {}",
        "an empty cell: a swap is valued on the curve",
        "It is kept for comparison and does not count; remove it if it is not wanted.",
        mild=True,
    )


def check_prices(cells: dict[str, Cells], numbers: dict[str, FloatArray], used: dict[str, BoolArray]) -> None:
    """Report prices that are none, and those stated twice over."""
    price = np.where(used["Price"], numbers["Price"], np.nan)
    with np.errstate(invalid="ignore"):
        cells["Price"].each(price <= 0.0, "the price is {}", "a price above 0 per 100 of nominal", _CORRECT)
        low = np.flatnonzero((price > 0.0) & (price < _LOW_PRICE))
    cells["Price"].each_with(
        low,
        (f"the price is {price[entry]:.12g} per 100 of nominal" for entry in low.tolist()),
        "a price per 100 of nominal",
        "It counts as it stands; multiply it by 100 if it is per 1.",
        mild=True,
    )
    both = used["Discount rate"] & ~np.isnan(numbers["Discount rate"]) & ~np.isnan(numbers["Price"])
    cells["Discount rate"].each(
        both,
        "the discount rate {} stands beside a price",
        "either a price or a discount rate",
        "Remove one of the two.",
    )


def check_dates(
    cells: dict[str, Cells],
    frequency: FloatArray,
    *,
    start: DayArray,
    first: DayArray,
    maturity: DayArray,
    used: dict[str, BoolArray],
) -> None:
    """Report dates that are out of order, and first coupons on no coupon date."""
    late = np.flatnonzero(start >= maturity)
    cells["Start date"].each_with(
        late,
        (f"the start date {start[entry]} is not before the maturity {maturity[entry]}" for entry in late),
        "a start date before the maturity",
        "Correct one of the two dates.",
    )
    has_first = ~np.isnat(first) & used["First coupon"]
    lonely = has_first & np.isnat(start)
    cells["First coupon"].each(
        lonely,
        "the first coupon {} stands without a start date",
        "a first coupon beside the date from which interest runs",
        "State the start date, or remove the first coupon if all periods are alike.",
    )
    outside = has_first & ~lonely & ((first <= start) | (first > maturity))
    entries = np.flatnonzero(outside)
    cells["First coupon"].each_with(
        entries,
        (
            f"the first coupon {first[entry]} is outside the life from {start[entry]} to {maturity[entry]}"
            for entry in entries
        ),
        "a date after the start and by the maturity",
        "Correct one of the dates.",
    )
    checked = has_first & ~lonely & ~outside & ~np.isnat(maturity) & np.isin(frequency, COUPON_FREQUENCIES)
    entries = np.flatnonzero(checked)
    off = entries[~_is_coupon_date(first[entries], maturity[entries], frequency[entries].astype(np.int64))]
    cells["First coupon"].each_with(
        off,
        (
            f"the first coupon {first[entry]} is no coupon date, counted back from the maturity "
            f"{maturity[entry]}"
            for entry in off
        ),
        "a date a whole number of periods before the maturity",
        "Correct the date, the frequency or the maturity.",
    )


def _is_coupon_date(day: DayArray, maturity: DayArray, frequency: NDArray[np.int64]) -> BoolArray:
    """Whether each date lies a whole number of periods before the maturity, month ends clipped."""
    month, last_month = day.astype("M8[M]"), maturity.astype("M8[M]")
    in_month = (day - month.astype("M8[D]")).astype(np.int64) + 1
    in_last = (maturity - last_month.astype("M8[D]")).astype(np.int64) + 1
    length = ((month + np.timedelta64(1, "M")).astype("M8[D]") - month.astype("M8[D]")).astype(np.int64)
    whole = (last_month - month).astype(np.int64) % (12 // frequency) == 0
    return np.asarray(whole & (in_month == np.minimum(in_last, length)))


def check_ex_dividend(
    cells: dict[str, Cells], numbers: dict[str, FloatArray], bought_ex: list[YesNo | None]
) -> None:
    """Report numbers of ex-dividend days that cannot be, and a purchase within none."""
    days, frequency = numbers["Ex-dividend days"], numbers["Frequency"]
    known = np.isin(frequency, COUPON_FREQUENCIES)
    most = _MOST_EX_DAYS // np.where(known, frequency, 1.0)
    with np.errstate(invalid="ignore"):
        odd = np.flatnonzero((days < 0.0) | (days > most) | (days != np.floor(days)) & ~np.isnan(days))
    cells["Ex-dividend days"].each_with(
        odd,
        (
            f"the number of ex-dividend days is {days[entry]:.12g}, not from 0 to {most[entry]:.0f}"
            for entry in odd
        ),
        "a whole number of days, fewer than between two coupons",
        _CORRECT,
    )
    bought = np.array([answer is YesNo.YES for answer in bought_ex], dtype=np.bool_)
    cells["Bought ex-dividend"].each(
        bought & (np.isnan(days) | (days == 0.0)) & ~cells["Ex-dividend days"].filled,
        "bought ex-dividend, but the ex-dividend days are not stated",
        'the number of days in "Ex-dividend days"',
        "State the ex-dividend days, or write no.",
    )
    cells["Bought ex-dividend"].each(
        bought & (days == 0.0),
        "bought ex-dividend, but there are 0 ex-dividend days",
        'a number of days above 0 in "Ex-dividend days"',
        "State the ex-dividend days, or write no.",
    )


def check_annuities(
    cells: dict[str, Cells], amortisations: list[Amortisation | None], kinds: KindMasks
) -> None:
    """Report annuities whose interest floats."""
    annuity = np.array([own is Amortisation.ANNUITY for own in amortisations], dtype=np.bool_)
    cells["Amortisation"].each(
        annuity & kinds.among((FLOATER, *SWAP_KINDS)),
        "the amortisation is {}, which is for bonds alone",
        "bullet or level where interest floats",
        "Write bullet or level.",
    )


def check_indexation(
    cells: dict[str, Cells], numbers: dict[str, FloatArray], kinds: KindMasks, *, has_inflation: bool
) -> None:
    """Report lags and index ratios that are none, and linked bonds without expected inflation."""
    lag, ratio = numbers["Index lag (months)"], numbers["Index ratio"]
    with np.errstate(invalid="ignore"):
        odd = (lag < 0.0) | (lag > _MOST_LAG_MONTHS) | (lag != np.floor(lag)) & ~np.isnan(lag)
        none = ratio <= 0.0
        far = (ratio > 100.0) | ((ratio > 0.0) & (ratio < 0.01))
    cells["Index lag (months)"].each(
        odd, "the index lag is {}", f"a whole number of months from 0 to {_MOST_LAG_MONTHS}", _CORRECT
    )
    cells["Index ratio"].each(none, "the index ratio is {}", "an index ratio above 0", _CORRECT)
    cells["Index ratio"].each(
        far & kinds.among([LINKED]),
        "the index ratio is {}",
        "the reference index today over that of the base date, mostly from 0.9 to 5",
        "It counts as it stands; divide by the base index if it is the index itself.",
        mild=True,
    )
    if not has_inflation:
        cells["Kind"].each(
            kinds.among([LINKED]),
            "a linked bond needs expected inflation, which the book does not have",
            'a sheet "Inflation" with terms and rates',
            "The amounts count as they stand today; add the sheet.",
            mild=True,
        )


def report_unused(
    cells: dict[str, Cells], kinds: list[HoldingKind | None], used: dict[str, BoolArray]
) -> None:
    """Report what a holding of its kind has no use for."""
    known = np.array([kind is not None for kind in kinds], dtype=np.bool_)
    for name, has_use in used.items():
        own = cells[name]
        flagged = own.filled & known & ~has_use
        flagged &= ~((own.kinds == Kind.NUMBER) & ((own.values == 0.0) | (own.values == USUAL.get(name))))
        if (word := SAYS_NOTHING.get(name)) is not None and flagged.any():
            texts = np.array([text.strip().casefold() == word for text in own.texts], dtype=np.bool_)
            place = np.flatnonzero(flagged & (own.kinds == Kind.TEXT))
            flagged[place[texts[own.values[place].astype(np.int64)]]] = False
        entries = np.flatnonzero(flagged)
        own.each_with(
            entries,
            (f"a {kinds[entry]} has no {name.lower()}" for entry in entries.tolist()),
            "an empty cell",
            "It is left out; remove it."
            if name in LEFT_OUT
            else "It is kept and not used; remove it if it is not wanted.",
            mild=True,
        )


def report_twice(cells: Cells, names: list[str]) -> None:
    seen: dict[str, int] = {}
    for entry, name in enumerate(names):
        if name and seen.setdefault(fold(name), entry) != entry:
            cells.mild(
                entry,
                f'the holding "{name[:60]}" stands twice, also in row {cells.rows[seen[fold(name)]] + 1}',
                "each holding under a name of its own",
                "Both count; rename one if they are two, remove one if they are the same.",
            )
