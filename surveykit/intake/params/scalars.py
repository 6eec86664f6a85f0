"""Plain YAML scalars under both editions of the language, and the spelling to use instead."""

from __future__ import annotations

import re
from typing import Any

import yaml

Scalar = str | int | float | bool | None

# YAML 1.2.2, section 10.3.2 (core schema), the table of tag resolution.
_CORE = (
    (re.compile(r"null|Null|NULL|~|"), lambda text: None),
    (re.compile(r"true|True|TRUE|false|False|FALSE"), lambda text: text.lower() == "true"),
    (re.compile(r"[-+]?[0-9]+"), int),
    (re.compile(r"0o[0-7]+"), lambda text: int(text[2:], 8)),
    (re.compile(r"0x[0-9a-fA-F]+"), lambda text: int(text[2:], 16)),
    (re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?"), float),
    (re.compile(r"[-+]?(\.inf|\.Inf|\.INF)"),
     lambda text: float("-inf") if text[0] == "-" else float("inf")),
    (re.compile(r"\.nan|\.NaN|\.NAN"), lambda text: float("nan")),
)
_SINGLE_LETTER = ("y", "Y", "n", "N")  # booleans in YAML 1.1, not in every reader of it
_LOADER: Any = yaml.SafeLoader("")  # reads scalars as the notebooks' runner does
MAX_NUMBER = 60


def core_reading(text: str) -> Scalar:
    """Return a plain scalar as YAML 1.2's core schema reads it.

    Examples
    --------
    >>> core_reading("0120"), core_reading("1e-3"), core_reading("12:30"), core_reading("no")
    (120, 0.001, '12:30', 'no')
    """
    for pattern, convert in _CORE:
        if pattern.fullmatch(text):
            return convert(text)
    return text


def implicit_tag(text: str) -> str:
    """Return the tag YAML 1.1 resolves a plain scalar to."""
    return str(_LOADER.resolve(yaml.ScalarNode, text, (True, False)))


def plain_reading(text: str) -> tuple[Scalar, str | None]:
    """Return the value of a plain scalar, and the spelling to use where editions differ.

    Returns
    -------
    value : str, int, float, bool or None
        The reading, or the likely meaning of a refused one.
    spelling : str or None
        Sentence part that says why it is refused and what to write; None if it is read.

    Examples
    --------
    >>> plain_reading("12")
    (12, None)
    >>> plain_reading("12:30")
    ('12:30', 'YAML reads a bare 12:30 as 750; write "12:30", in quotes')
    """
    tag = implicit_tag(text)
    quoted = f'"{text}", in quotes' if '"' not in text else f"'{text}', in quotes"
    if tag.endswith((":int", ":float")) and len(text) > MAX_NUMBER:
        return text, f"a number of {len(text)} characters; write {MAX_NUMBER} or fewer"
    if tag.endswith(":timestamp"):
        return text, f"YAML reads a bare {text} as a date in some readers; write {quoted}"
    if tag.endswith((":merge", ":value")):
        return text, f"{text} has a meaning of its own in YAML; write the keys out, or {quoted}"
    if text in _SINGLE_LETTER:
        return text, (f"some YAML readers take {text} for yes or no; "
                      f"write true or false, or {quoted}")
    try:
        old = _LOADER.yaml_constructors[tag](_LOADER, yaml.ScalarNode(tag, text))
        core = core_reading(text)
    except (ValueError, ArithmeticError, yaml.YAMLError):
        return text, f"no YAML reader agrees on it; write {quoted}"
    if type(old) is type(core) and (old == core or (old != old and core != core)):
        return core, None
    if isinstance(old, bool):
        word = "true" if old else "false"
        return text, f"YAML reads a bare {text} as {word} or as text; write {word}, or {quoted}"
    if ":" in text:
        return text, f"YAML reads a bare {text} as {old}; write {quoted}"
    number = next((value for value in (core, old) if isinstance(value, int | float)), None)
    if number is None:
        return text, f"YAML readers differ on a bare {text}; write {quoted}"
    told, too = ("text" if isinstance(value, str) else repr(value) for value in (old, core))
    return core, (f"YAML reads a bare {text} as {told} or as {too}; "
                  f"write {number_text(number)}, or {quoted}")


def number_text(value: float) -> str:
    """Return a number as both editions read it.

    Examples
    --------
    >>> number_text(1e-3), number_text(1e-10), number_text(2e4), number_text(1e30)
    ('0.001', '1.0e-10', '20000', '1.0e+30')
    """
    text = repr(value)
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        text = str(int(value))
    elif "e" in text:
        mantissa, exponent = text.split("e")
        mantissa += "" if "." in mantissa else ".0"
        text = f"{mantissa}e{exponent if exponent[0] in '+-' else '+' + exponent}"
    elif text in ("inf", "-inf"):
        text = text.replace("inf", ".inf")
    return text
