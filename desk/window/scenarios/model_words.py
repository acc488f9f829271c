"""What each model is for, in plain words, and what each measure may be used for."""

from __future__ import annotations

from desk.book import Book, Bridge, Measure, ModelName, Sampling
from desk.window.parts import numbers
from desk.window.parts.fields import Choice
from desk.window.parts.models import MODEL_TITLES

__all__ = ["BRIDGES", "MEASURES", "MODELS", "SAMPLINGS", "set_sentence"]

_FITTED = "It reprices the book's curve exactly."
_OWN = "It makes a curve of its own, which is not the book's: present values are on that one."
_MAY_FALL = "Rates may fall below zero."
_ABOVE = "Rates stay above zero."

_WHAT = {
    ModelName.VASICEK: "For studies of one rate that is pulled back to a long-run level, with normal moves "
    f"of one size. {_MAY_FALL} {_OWN}",
    ModelName.HO_LEE: "For short horizons: rates wander with normal moves of one size and are not pulled "
    f"back, so that they spread without end. {_MAY_FALL} {_FITTED}",
    ModelName.HULL_WHITE: "For most uses: one factor with normal moves that is pulled back to what the curve "
    f"expects; all rates move together. {_MAY_FALL} {_FITTED}",
    ModelName.GAUSSIAN_2: "For gaps that depend on the shape of the curve: two factors with normal moves, so "
    f"that short and long rates need not move together. {_MAY_FALL} {_FITTED}",
    ModelName.CIR: "For studies of a rate that moves less when it is low, by the root of itself. Rates do "
    f"not fall below zero. {_OWN}",
    ModelName.CIR_SHIFTED: "For a rate whose moves shrink when it is low, by the root of a factor, beside a "
    f"shift that varies with time. Rates may fall below zero where the shift does. {_FITTED}",
    ModelName.BLACK_KARASINSKI: "For rates that cannot fall below zero and move in proportion to themselves: "
    f"the logarithm of the rate is normal and pulled back. {_ABOVE} {_FITTED} Forward rates must be above 0.",
    ModelName.OUTSIDE: "For scenarios prescribed or made elsewhere: the paths in the sheet Scenario set, as "
    "they are. They need not reprice the book's curve: see the checks. Flows after the last node are "
    "discounted from there by the book's curve.",
}

MODELS = tuple(Choice(name, title, _WHAT[name]) for name, title in MODEL_TITLES.items())

MEASURES = (
    Choice(
        Measure.PRICING,
        "Pricing",
        "For values: what flows are worth. Every asset earns the short rate on average; it is no forecast.",
    ),
    Choice(
        Measure.REAL_WORLD,
        "Real world",
        "For forecasts: what may happen, with prices of risk and premiums. Its averages are no prices.",
    ),
)

SAMPLINGS = (
    Choice(Sampling.PLAIN, "Plain", "Every path is drawn by itself."),
    Choice(
        Sampling.ANTITHETIC,
        "Antithetic",
        "Every path has a mirror image: what rises and falls with the rates alike cancels out.",
    ),
    Choice(
        Sampling.SOBOL,
        "Sobol points",
        "The main directions of the paths come from evenly spread points: most is gained in means, at paths "
        "that are a power of two times the replicates.",
    ),
)

BRIDGES = (
    Choice(
        Bridge.COMPONENTS, "Principal components", "The points move the greatest directions of a path first."
    ),
    Choice(
        Bridge.BROWNIAN,
        "Brownian bridge",
        "The points move the end of a path first, then its middle, and on.",
    ),
)


def set_sentence(book: Book) -> str:
    """What the set of scenarios of a book holds; what it lacks where there is none."""
    found = book.scenario_set
    if found is None or not found.rate.size:
        return "The book has no sheet Scenario set: one row a path, one column a node in years."
    low, high = float(found.rate.min()), float(found.rate.max())
    return (
        f"The set holds {numbers.integer(len(found.rate))} paths at {numbers.integer(found.node.size)} nodes "
        f"from {numbers.exact(float(found.node[0]))} to {numbers.exact(float(found.node[-1]))} years, with "
        f"rates from {numbers.rate(low, with_unit=True)} to {numbers.rate(high, with_unit=True)}."
    )
