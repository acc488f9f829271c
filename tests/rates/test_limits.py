"""The integrals of `desk.rates.limits` against 200-digit arithmetic."""

from __future__ import annotations

from decimal import Decimal, localcontext

import numpy as np
import pytest

from desk.rates.limits import first_integral, mixed_integral, product_integral, second_integral

PRODUCTS = [0.0, 1e-18, 1e-9, 1e-4, 0.02, 0.3, 0.49, 0.51, 0.99, 1.01, 1.99, 2.01, 8.0, 200.0, 3000.0]


def _length(speed: Decimal, time: Decimal) -> Decimal:
    return (1 - (-speed * time).exp()) / speed


def _speed(value: float) -> Decimal:
    """A speed of exactly 0 is replaced by one that differs from it by less than the arithmetic shows."""
    return Decimal(value) if value else Decimal("1e-40")


@pytest.mark.parametrize("time", [1.0 / 12.0, 1.0, 40.0])
def test_every_integral_is_right_to_rounding(time: float) -> None:
    with localcontext() as context:
        context.prec = 200
        years = Decimal(time)
        for first in PRODUCTS:
            a = first / time
            one = _speed(a)
            exact = [_length(one, years), (years - _length(one, years)) / one]
            found = [first_integral(a, time), second_integral(a, time)]
            for second in PRODUCTS:
                b = second / time
                two = _speed(b)
                both = _length(one + two, years)
                exact += [
                    (_length(one, years) - both) / two,
                    (years - _length(one, years) - _length(two, years) + both) / (one * two),
                ]
                found += [mixed_integral(a, b, time), product_integral(a, b, time)]
            for value, expected in zip(found, exact, strict=True):
                assert abs(Decimal(float(value)) / expected - 1) < Decimal("1e-14")


@pytest.mark.parametrize("speed", [-3.0, -0.2, -1e-9])
def test_negative_speeds_of_the_first_two(speed: float) -> None:
    with localcontext() as context:
        context.prec = 100
        one, years = Decimal(speed), Decimal(2)
        length = _length(one, years)
        assert float(first_integral(speed, 2.0)) == pytest.approx(float(length), rel=1e-14)
        assert float(second_integral(speed, 2.0)) == pytest.approx(float((years - length) / one), rel=1e-14)


def test_shapes_are_kept() -> None:
    times = np.linspace(0.0, 3.0, 6).reshape(2, 3)
    for value in (
        first_integral(0.3, times),
        second_integral(0.3, times),
        mixed_integral(0.3, 0.5, times),
        product_integral(0.3, 0.3, times),
        product_integral(0.0, 0.0, times),
    ):
        assert value.shape == (2, 3)
        assert value[0, 0] == 0.0
