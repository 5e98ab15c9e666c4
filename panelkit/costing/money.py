"""Money: exact inside, rounded once to the minor unit of its currency."""

import math
from collections.abc import Mapping
from decimal import Decimal
from fractions import Fraction
from typing import Final

from panelkit.config import MINOR_DIGITS
from panelkit.errors import UsageError

__all__ = [
    "CURRENCY_EXPONENTS",
    "format_money",
    "from_minor_units",
    "minor_units",
    "round_money",
]

CURRENCY_EXPONENTS: Final[Mapping[str, int]] = MINOR_DIGITS
"""Digits of the minor unit by ISO 4217 code."""


def minor_units(amount: Fraction | Decimal | int, currency: str) -> int:
    """Return an amount in whole minor units, halves rounded away from zero.

    Parameters
    ----------
    amount : Fraction, Decimal or int
        An exact amount.
    currency : str
        ISO 4217 code.

    Returns
    -------
    int
        Cents of a euro, yen, thousandths of a dinar.

    Raises
    ------
    UsageError
        If the currency is unknown.
    """
    scaled = abs(Fraction(amount)) * int(10 ** _exponent(currency))
    units = math.floor(scaled + Fraction(1, 2))
    return -units if amount < 0 else units


def from_minor_units(units: int, currency: str) -> Decimal:
    """Return the amount that a number of minor units makes.

    Parameters
    ----------
    units : int
        Whole minor units.
    currency : str
        ISO 4217 code.

    Returns
    -------
    Decimal
        With exactly the digits of the currency.

    Raises
    ------
    UsageError
        If the currency is unknown.
    """
    digits = tuple(int(digit) for digit in str(abs(units)))
    # Built from its parts, since arithmetic would round to the context's precision.
    return Decimal((int(units < 0), digits, -_exponent(currency)))


def round_money(amount: Fraction | Decimal | int, currency: str) -> Decimal:
    """Return an amount rounded to the minor unit, halves away from zero.

    Parameters
    ----------
    amount : Fraction, Decimal or int
        An exact amount.
    currency : str
        ISO 4217 code.

    Returns
    -------
    Decimal
        With exactly the digits of the currency.

    Raises
    ------
    UsageError
        If the currency is unknown.
    """
    return from_minor_units(minor_units(amount, currency), currency)


def format_money(amount: Fraction | Decimal | int, currency: str) -> str:
    """Return an amount for people, such as ``"51,391.40 EUR"``.

    Parameters
    ----------
    amount : Fraction, Decimal or int
        An exact amount; it is rounded to the minor unit.
    currency : str
        ISO 4217 code.

    Returns
    -------
    str
        With commas between thousands and the code behind.

    Raises
    ------
    UsageError
        If the currency is unknown.
    """
    return f"{round_money(amount, currency):,f} {currency}"


def _exponent(currency: str) -> int:
    if currency not in CURRENCY_EXPONENTS:
        raise UsageError(
            code="currency-unknown",
            where="currency",
            what=f"no currency has this code (got {currency!r})",
            accepted="a three-letter code of ISO 4217 in capitals, such as EUR or JPY",
            next_step="Write the currency as its code",
        )
    return CURRENCY_EXPONENTS[currency]
