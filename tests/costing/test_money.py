"""Money: exact sums, one rounding, the digits of each currency."""

from decimal import Decimal
from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from panelkit.costing.money import (
    CURRENCY_EXPONENTS,
    format_money,
    from_minor_units,
    minor_units,
    round_money,
)
from panelkit.errors import UsageError


@pytest.mark.parametrize(
    ("amount", "currency", "rounded"),
    [
        # panelkit cost model, worked example EX11
        ("1234.5675", "EUR", "1234.57"),
        ("1234.5675", "JPY", "1235"),
        ("1234.5675", "BHD", "1234.568"),
        ("2.675", "EUR", "2.68"),  # a binary float holds less than 2.675
        ("-2.675", "EUR", "-2.68"),
        ("0.004", "EUR", "0.00"),
        ("-0.004", "EUR", "0.00"),
    ],
)
def test_halves_are_rounded_away_from_zero(amount, currency, rounded):
    assert str(round_money(Decimal(amount), currency)) == rounded


def test_sums_of_rounded_lines_differ_from_rounded_sums():
    # panelkit cost model, worked example EX11
    amounts = [Decimal("10.005"), Decimal("20.005"), Decimal("30.005")]
    lines = [round_money(amount, "EUR") for amount in amounts]
    assert sum(lines) == Decimal("60.03")
    assert round_money(sum(amounts), "EUR") == Decimal("60.02")


@given(st.fractions(max_denominator=10**6), st.sampled_from(["EUR", "JPY", "BHD"]))
def test_rounding_moves_by_at_most_half_a_minor_unit(amount, currency):
    # From the definition; fails if any step goes through a context or a float.
    unit = Fraction(1, 10 ** CURRENCY_EXPONENTS[currency])
    rounded = round_money(amount, currency)
    assert abs(Fraction(rounded) - amount) <= unit / 2
    assert round_money(-amount, currency) == rounded.copy_negate()
    assert minor_units(rounded, currency) * unit == Fraction(rounded)


def test_large_amounts_keep_every_digit():
    # The decimal context holds 28 digits; this amount has 42.
    units = 123456789012345678901234567890123456789012
    assert minor_units(from_minor_units(units, "EUR"), "EUR") == units


def test_money_for_people():
    # panelkit cost model, worked example EX1
    assert format_money(Decimal("51391.4"), "EUR") == "51,391.40 EUR"
    assert format_money(Fraction(1234567), "JPY") == "1,234,567 JPY"


@pytest.mark.parametrize("currency", ["EURO", "eur", "", "XTS", "XXX", "XAU"])
def test_unknown_currencies_are_refused(currency):
    with pytest.raises(UsageError) as caught:
        round_money(1, currency)
    assert caught.value.code == "currency-unknown"
    assert caught.value.exit_code == 2


def test_exponents_other_than_two():
    # panelkit cost model, section 2.2
    zero = "BIF CLP DJF GNF ISK JPY KMF KRW PYG RWF UGX VND VUV XAF XOF XPF"
    three = "BHD IQD JOD KWD LYD OMR TND"
    assert {CURRENCY_EXPONENTS[code] for code in zero.split()} == {0}
    assert {CURRENCY_EXPONENTS[code] for code in three.split()} == {3}
    assert CURRENCY_EXPONENTS["EUR"] == 2
