"""How numbers, units, quantities and dates are written on the page: one place, one rule each.

The page rule (coarser than two significant digits of U): temperatures and their U to 0.1, albedo
and NDVI to 0.001. A U that would print as zero prints as one step. The CSV files keep every digit.
"""

from __future__ import annotations

import datetime as dt
import math
from collections.abc import Iterable, Mapping
from typing import Any

import pandas as pd

from .typeset import MINUS, NO_BREAK, typeset

NARROW_SPACE, DASH = "\u202f", "\u2013"
PLACES = {"temperature": 1, "albedo": 3, "ndvi": 3}
UNITS = {"degC": "°C", "1": "", "K a-1": "K a⁻¹", "a-1": "a⁻¹",
         "W m-2": "W m⁻²", "m s-1": "m s⁻¹", "uV": "µV", "deg": "°",
         "J m-2 K-1 s-1/2": "J m⁻² K⁻¹ s⁻¹ᐟ²", "K-1": "K⁻¹", "kg m-3": "kg m⁻³"}
QUANTITIES = {"temperature": "Temperature", "albedo": "Albedo", "ndvi": "NDVI"}
ASYMMETRY = 0.20  # of the interval's two arms, above which both ends are printed (GUM supplement 1)


def unit_text(unit: str) -> str:
    """Return the unit as printed; a plain ratio has none.

    Examples
    --------
    >>> unit_text("degC"), unit_text("1"), unit_text("W m-2")
    ('°C', '', 'W m⁻²')
    """
    return UNITS.get(unit, typeset(unit))


def quantity_text(quantity: str, kind: str = "") -> str:
    """Return the quantity and its kind as a heading.

    Examples
    --------
    >>> quantity_text("temperature", "stand-off"), quantity_text("ndvi")
    ('Temperature, stand-off', 'NDVI')
    """
    name = QUANTITIES.get(quantity, quantity)
    return f"{name}, {kind}" if kind else name


def heading(quantity: str, kind: str, unit: str) -> str:
    """Return the quantity and its kind with the unit.

    Examples
    --------
    >>> heading("temperature", "contact", "degC"), heading("ndvi", "", "1")
    ('Temperature, contact, °C', 'NDVI')
    """
    written = unit_text(unit)
    return quantity_text(quantity, kind) + (f", {written}" if written else "")


def inside_sentence(quantity: str, kind: str = "") -> str:
    """Return the quantity as it stands inside a sentence.

    Examples
    --------
    >>> inside_sentence("albedo", "clear"), inside_sentence("ndvi")
    ('albedo (clear)', 'NDVI')
    """
    name = quantity if quantity != "ndvi" else "NDVI"
    return f"{name} ({kind})" if kind else name


def families(frame: pd.DataFrame) -> list[tuple[tuple[str, str], pd.DataFrame]]:
    """Return (quantity, kind) and its rows, in the page's order; nothing is mixed across them."""
    order = {name: place for place, name in enumerate(PLACES)}
    pairs = sorted({*zip(frame["quantity"], frame["kind"], strict=True)},
                   key=lambda pair: (order.get(pair[0], len(order)), *pair))
    return [(pair, of_family(frame, *pair)) for pair in pairs]


def product_text(product: str) -> str:
    """Return a derived product as it stands inside a sentence.

    Examples
    --------
    >>> product_text("net_radiation"), product_text("sri")
    ('net radiation', 'SRI')
    """
    return product.upper() if product in ("sri", "savi") else product.replace("_", " ")


def of_family(frame: pd.DataFrame, quantity: str, kind: str) -> pd.DataFrame:
    """Return the rows of one quantity and kind."""
    return frame[(frame["quantity"] == quantity) & (frame["kind"] == kind)]


def difference_unit(quantity: str) -> str:
    """Return the unit of a difference or an uncertainty of a quantity."""
    return "K" if quantity == "temperature" else "1"


def places(quantity: str) -> int:
    """Return the number of decimals that the page gives a quantity."""
    return PLACES.get(quantity, 3)


def number(value: float, decimals: int, *, sign: bool = False) -> str:
    """Return a number with a true minus sign, never a negative zero; "" where it is missing.

    Examples
    --------
    >>> number(-0.04, 1), number(2.345, 1, sign=True), number(float("nan"), 1)
    ('0.0', '+2.3', '')
    """
    if not math.isfinite(value):
        return "" if math.isnan(value) else ("∞" if value > 0 else f"{MINUS}∞")
    text = f"{value:.{decimals}f}"
    if float(text) == 0:
        return f"{0:.{decimals}f}"
    plus = "+" if sign else ""
    return text.replace("-", MINUS) if value < 0 else plus + text


def expanded(u: float, decimals: int) -> str:
    """Return an uncertainty; one that would print as zero prints as one step.

    Examples
    --------
    >>> expanded(0.004, 1), expanded(2.25, 1)
    ('0.1', '2.2')
    """
    if not math.isfinite(u):
        return number(u, decimals)
    return f"{max(u, 10.0 ** -decimals):.{decimals}f}"


def interval(value: float, lower: float, upper: float, decimals: int, *,
             sign: bool = False) -> str:
    """Return `value ± U`, or both ends where the arms differ by more than a fifth.

    Without an interval the value stands alone; without a value the text is empty. Its spaces do
    not break.

    Examples
    --------
    >>> [text.replace(NO_BREAK, " ") for text in (
    ...     interval(41.66, 39.54, 43.78, 1), interval(0.3, 0.2, 0.6, 3))]
    ['41.7 ± 2.1', '0.300 (0.200 to 0.600)']
    """
    centre = number(value, decimals, sign=sign)
    if not centre or math.isnan(lower) or math.isnan(upper):
        return centre
    below, above = value - lower, upper - value
    if min(below, above) < (1 - ASYMMETRY) * max(below, above):
        ends = (number(end, decimals, sign=sign) for end in (lower, upper))
        if len(set(texts := [*ends])) > 1:
            return f"{centre} ({texts[0]} to {texts[1]})".replace(" ", NO_BREAK)
    return f"{centre} ± {expanded((upper - lower) / 2, decimals)}".replace(" ", NO_BREAK)


def with_unit(text: str, unit: str) -> str:
    """Return the text followed by its unit, unbroken.

    Examples
    --------
    >>> with_unit("41.7", "degC").replace(NO_BREAK, " "), with_unit("0.300", "1")
    ('41.7 °C', '0.300')
    """
    written = unit_text(unit)
    return f"{text}{NO_BREAK}{written}" if written and text else text


def figures(value: float, digits: int = 2) -> str:
    """Return a plain number to so many significant digits, never in E notation below 1e6.

    Examples
    --------
    >>> figures(0.012345), figures(182.4), figures(0), figures(float("nan"))
    ('0.012', '182', '0', '')
    """
    if not math.isfinite(value) or value == 0:
        return number(value, 0)
    decimals = max(0, digits - 1 - math.floor(math.log10(abs(value))))
    return number(value, decimals)


def count(value: int) -> str:
    r"""Return a count, thousands set apart by a narrow space.

    Examples
    --------
    >>> count(21600) == "21\u202f600", count(934)
    (True, '934')
    """
    return f"{value:,}".replace(",", NARROW_SPACE)


def percent(share: float) -> str:
    """Return a share as whole percent; a small one as less than 1.

    Examples
    --------
    >>> [percent(share).replace(NO_BREAK, " ") for share in (0.613, 0.004, 0.0)]
    ['61 %', '< 1 %', '0 %']
    """
    if math.isnan(share):
        return ""
    return ("< 1 %" if 0 < share < 0.005 else f"{100 * share:.0f} %").replace(" ", NO_BREAK)


def probability(p: float) -> str:
    """Return a p-value to three decimals.

    Examples
    --------
    >>> probability(0.0001), probability(0.0312)
    ('< 0.001', '0.031')
    """
    return "< 0.001" if p < 0.0005 else number(p, 3)


def date_text(iso: str) -> str:
    """Return an ISO date in words; any other text unchanged.

    Examples
    --------
    >>> date_text("2025-07-24")
    '24 July 2025'
    """
    try:
        day = dt.date.fromisoformat(iso)
    except ValueError:
        return iso
    return f"{day.day} {day:%B %Y}"


def listing(items: Iterable[str], last: str = "and") -> str:
    """Return the items as a phrase.

    Examples
    --------
    >>> listing(["a", "b", "c"]), listing(["a"])
    ('a, b and c', 'a')
    """
    *head, tail = [*items] or [""]
    return f"{', '.join(head)} {last} {tail}" if head else tail


def plural(n: int, one: str, many: str = "") -> str:
    """Return the count with its noun.

    Examples
    --------
    >>> plural(1, "pass", "passes"), plural(3, "patch", "patches"), plural(2, "surface")
    ('1 pass', '3 patches', '2 surfaces')
    """
    return f"{count(n)} {one if n == 1 else many or one + 's'}"


def label(name: Any, labels: Mapping[str, str] | None) -> str:
    """Return the user's label of a surface, or its name where none was given."""
    return (labels or {}).get(name) or str(name)


def sentence_case(text: str) -> str:
    """Return the text with its first letter raised, unless a name in code, and a full stop.

    Examples
    --------
    >>> sentence_case("one pass"), sentence_case("width_m is missing")
    ('One pass.', 'width_m is missing.')
    """
    text = text.strip()
    first, _, rest = text.partition(" ")
    plain_word = first.rstrip(":,").isalpha() or first.startswith("pseudo-")
    if plain_word and not rest.startswith("="):
        text = text[:1].upper() + text[1:]
    return text + ("" if text[-1:] in ".!?" else ".") if text else ""


def plain(value: Any) -> str:
    """Return a settings value as text: numbers short, ranges and lists joined, none as a dash.

    Examples
    --------
    >>> plain(None), plain(True), plain([-40, 120.0]), plain({"red": 660})
    ('–', 'yes', '−40, 120', 'red 660')
    """
    if value is None or (isinstance(value, float) and math.isnan(value)):
        return DASH
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, int | float):
        return f"{value:.10g}".replace("-", MINUS)
    if isinstance(value, Mapping):
        return "; ".join(f"{key} {plain(inner)}" for key, inner in value.items())
    if isinstance(value, list | tuple):
        return ", ".join(plain(inner) for inner in value)
    return str(value)
