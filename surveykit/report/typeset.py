"""Typographic marks of the page: one rule each, applied to every text on its way into the page."""

from __future__ import annotations

import re

NO_BREAK, MINUS = "\u00a0", "\u2212"
_SUPERSCRIPT = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")
_RULES = (
    (re.compile(r"(?<=\w)'(?=\w)|(?<=s)'(?=\s|$)"), "’"),           # the head's, two heads'
    (re.compile(r"(?<!\w)'([^'<>&]{1,120})'(?!\w)"), r"“\1”"),       # 'a name', as messages quote
    (re.compile(r"(?<=\d)%"), f"{NO_BREAK}%"),                       # 18%
    (re.compile(r"\bdegC\b"), "°C"),
    (re.compile(r"(?<![\w.,)\]\-/])-(?=\d)"), MINUS),                # -20, never 2025-06-11
)
_UNIT = re.compile(r"(?<=\S) (m|s|K|sr|kg|min)(-[1-4])(?![\w-])")  # W m-2, m s-1
_AFTER_NUMBER = re.compile(r"(?<=\d) (?=(?:°C|K|W|mm|cm|m|s|min|h|hPa)(?![\w°-]))")


def typeset(text: str) -> str:
    """Return the text with apostrophes, minus signs, per cent and units as printed, unbroken.

    Examples
    --------
    >>> typeset("the head's 18% at -2 degC and 3 m s-1").replace(NO_BREAK, " ")
    'the head’s 18 % at −2 °C and 3 m s⁻¹'
    >>> typeset("A1-contact-1 of yard-2025-06-11"), typeset("column 'crew' is not known")
    ('A1-contact-1 of yard-2025-06-11', 'column “crew” is not known')
    """
    for pattern, put in _RULES:
        text = pattern.sub(put, text)
    text = _UNIT.sub(lambda m: NO_BREAK + m[1] + m[2].translate(_SUPERSCRIPT), text)
    return _AFTER_NUMBER.sub(NO_BREAK, text)
