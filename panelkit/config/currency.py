"""Currencies and the digits of their minor units (ISO 4217)."""

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

__all__ = ["MINOR_DIGITS"]

_TWO_DIGITS = """
AED AFN ALL AMD AOA ARS AUD AWG AZN BAM BBD BDT BMD BND BOB BOV BRL BSD BTN BWP BYN
BZD CAD CDF CHE CHF CHW CNY COP COU CRC CUP CVE CZK DKK DOP DZD EGP ERN ETB EUR FJD
FKP GBP GEL GHS GIP GMD GTQ GYD HKD HNL HTG HUF IDR ILS INR IRR JMD KES KGS KHR KPW
KYD KZT LAK LBP LKR LRD LSL MAD MDL MGA MKD MMK MNT MOP MRU MUR MVR MWK MXN MXV MYR
MZN NAD NGN NIO NOK NPR NZD PAB PEN PGK PHP PKR PLN QAR RON RSD RUB SAR SBD SCR SDG
SEK SGD SHP SLE SOS SRD SSP STN SVC SYP SZL THB TJS TMT TOP TRY TTD TWD TZS UAH USD
USN UYU UZS VED VES WST XCD XCG YER ZAR ZMW ZWG
"""
_OTHER_DIGITS = {
    0: "BIF CLP DJF GNF ISK JPY KMF KRW PYG RWF UGX UYI VND VUV XAF XOF XPF",
    3: "BHD IQD JOD KWD LYD OMR TND",
    4: "CLF UYW",
}

MINOR_DIGITS: Final[Mapping[str, int]] = MappingProxyType(
    {code: 2 for code in _TWO_DIGITS.split()}
    | {code: n for n, codes in _OTHER_DIGITS.items() for code in codes.split()}
)
"""Digits of the minor unit by ISO 4217 code. Codes without a minor unit (metals,
units of account) and the test codes are left out: nothing is priced in them."""
