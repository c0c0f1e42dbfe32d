"""Currencies as price lists write them: codes of ISO 4217, signs and words.

A sign that several currencies share ("$", "kr") stays that sign: which one it is, is not for Ferrule to say, and
prices under like signs of one list do add up.
"""

from __future__ import annotations

import re

#: Codes of ISO 4217 (2015; from memory) that stand for a currency in a text; as a value, three capitals will do.
_CODES = frozenset(
    "AED ARS AUD BGN BRL CAD CHF CLP CNY COP CZK DKK EGP EUR GBP HKD HUF IDR ILS INR ISK JPY KES KRW MAD MXN MYR NGN"
    " NOK NZD PEN PHP PKR PLN RON RSD SAR SEK SGD THB TND TRY TWD UAH USD UYU VND ZAR".split()
)
_SIGNS = {"€": "EUR", "£": "GBP", "US$": "USD", "A$": "AUD", "C$": "CAD", "NZ$": "NZD", "R$": "BRL", "₹": "INR",
          "₺": "TRY", "zł": "PLN", "Kč": "CZK", "Ft": "HUF", "Fr.": "CHF", "$": "$", "¥": "¥", "kr": "kr"}  # fmt: skip
_WORDS = {"euro": "EUR", "euros": "EUR", "sfr": "CHF", "rmb": "CNY"}

_LONGEST_FIRST = sorted(_SIGNS, key=len, reverse=True)
_FOUND = re.compile(
    "|".join(
        [rf"(?<![^\W\d_])(?:{re.escape(s)})(?![^\W\d_])" if s[0].isalpha() and s[-1].isalpha() else re.escape(s) for s in _LONGEST_FIRST]
        + [rf"(?<![^\W\d_])(?i:{'|'.join(sorted(_CODES | {w.upper() for w in _WORDS}, key=len, reverse=True))})(?![^\W\d_])"]
    )
)


def currency_of(text: str) -> str | None:
    """The currency that a text names; ``None`` where it names none, or more than one.

    >>> currency_of("Price [EUR]"), currency_of("69,00 €"), currency_of("US$ 1,090"), currency_of("price")
    ('EUR', 'EUR', 'USD', None)
    """
    found = {_named(match[0]) for match in _FOUND.finditer(text)}
    if len(found) == 1:
        return found.pop()
    return text.strip() if not found and re.fullmatch(r"\s*[A-Z]{3}\s*", text) else None


def without_currency(text: str) -> str:
    """The text without the currencies that it names, and without the dash that stands for no cents ("69,-").

    >>> without_currency("EUR 1.090,-")
    '1.090'
    """
    return re.sub(r"[.,][-\u2013\u2014]+$", "", _FOUND.sub(" ", text).strip()).strip()


def _named(found: str) -> str:
    return _SIGNS.get(found) or _WORDS.get(found.casefold()) or found.upper()
