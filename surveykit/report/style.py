"""One look for all figures, and the one way in which a figure is shown: PNG with alt text.

Figures are drawn without pyplot (nothing to close, no backend) at the width of the text column,
so that their lettering stays readable on a phone. seaborn's colour-blind palette always goes
with a marker or a hatch; maps use one hue, light to dark.
"""

from __future__ import annotations

import base64
import io
import warnings
from collections.abc import Callable, Iterable, Sequence
from typing import Any, Literal, NamedTuple
from zoneinfo import ZoneInfo

import matplotlib as mpl
import matplotlib.dates as mdates
import numpy as np
import pandas as pd
import seaborn as sns
from IPython.display import display
from matplotlib.axes import Axes
from matplotlib.colors import ListedColormap
from matplotlib.figure import Figure
from matplotlib.layout_engine import ConstrainedLayoutEngine
from PIL import Image

from .markup import paragraph
from .typeset import typeset
from .wording import families

WIDTH_IN, DPI = 4.2, 190
PAPER, INK, MUTED, HAIRLINE = "#ffffff", "#1f1e1b", "#5d5a53", "#d9d5ca"
_COLOURS = sns.color_palette("colorblind").as_hex()
PALETTE = tuple(_COLOURS[i] for i in (0, 3, 2, 4, 5, 1, 9, 7))  # strongest on paper first
MARKERS = ("o", "s", "D", "^", "v", "P", "X", "*")
HATCHES = ("", "//", "..", "\\\\", "xx", "--", "++", "o")

def even_ramp(colour: str) -> ListedColormap:
    """Return one hue from near white to `colour`, its steps even in lightness.

    References
    ----------
    CIE 015:2018 (from memory): lightness L* of the luminance of IEC 61966-2-1 (sRGB).
    """
    colours = np.array(sns.light_palette(colour, 1024))
    linear = np.where(colours > 0.04045, ((colours + 0.055) / 1.055) ** 2.4, colours / 12.92)
    lightness = 116 * np.cbrt(linear @ [0.2126, 0.7152, 0.0722]) - 16
    even = np.linspace(lightness[-1], lightness[0], 256)[::-1]
    return ListedColormap(colours[np.searchsorted(-lightness, -even).clip(0, 1023)])


RAMP = even_ramp("#62a9d8")  # light enough for ink at its dark end
MAP_RAMP = even_ramp("#123a5c")
STYLE: Any = {
    **sns.axes_style("ticks"), "figure.facecolor": PAPER, "axes.facecolor": PAPER,
    "savefig.facecolor": PAPER, "font.family": "sans-serif", "font.sans-serif": ["DejaVu Sans"],
    "font.size": 9, "axes.titlesize": 9.5, "axes.titleweight": "bold", "axes.titlelocation": "left",
    "axes.labelsize": 9, "xtick.labelsize": 8.5, "ytick.labelsize": 9, "legend.fontsize": 8.5,
    "legend.frameon": False, "text.color": INK, "axes.labelcolor": INK, "axes.edgecolor": MUTED,
    "xtick.color": MUTED, "ytick.color": MUTED, "xtick.labelcolor": INK, "ytick.labelcolor": INK,
    "axes.linewidth": 0.7, "grid.color": HAIRLINE, "grid.linewidth": 0.7, "hatch.linewidth": 0.6,
    "text.parse_math": False, "axes.unicode_minus": True, "svg.hashsalt": "surveykit",
}


class Drawing(NamedTuple):
    """A figure with its caption and the text that stands in for it; no figure, only the text."""

    figure: Figure | None
    alt: str
    caption: str = ""


def of_each(frame: pd.DataFrame, draw: Callable[[str], Drawing],
            empty: str) -> tuple[Drawing, ...]:
    """Return a drawing for each quantity of a table, or the sentence that there is none."""
    quantities = dict.fromkeys(quantity for (quantity, _), _ in families(frame))
    return tuple(draw(quantity) for quantity in quantities) or (Drawing(None, empty),)


def kinds(frame: pd.DataFrame, quantity: str) -> list[tuple[str, pd.DataFrame]]:
    """Return kind and rows of one quantity, in the page's order."""
    return [(kind, block) for (name, kind), block in families(frame) if name == quantity]


styled = mpl.rc_context(STYLE)  # a decorator: draws under the house style


def panels(heights: Sequence[float], **kwargs: Any) -> tuple[Figure, list[Axes]]:
    """Return a figure of the text column's width with stacked panels, heights in inches."""
    figure = Figure(figsize=(WIDTH_IN, sum(heights) + 0.25), dpi=DPI,
                    layout=ConstrainedLayoutEngine(h_pad=0.06))
    axes = figure.subplots(len(heights), 1, squeeze=False, height_ratios=heights, **kwargs)
    return figure, [*axes[:, 0]]


def dress(axis: Axes, title: str = "", label: str = "", grid: Literal["x", "y", ""] = "y",
          *, plain: bool = False, left: bool = False) -> None:
    """Give a panel its title (`plain`: not bold), the label of its y axis, its grid, no frame.

    `left` takes off the line of the y axis too.
    """
    axis.set_title(title, {"fontweight": "normal", "fontsize": 9} if plain else None)
    axis.set_ylabel(label)
    if grid:
        axis.grid(axis=grid)
    sns.despine(ax=axis, left=left)


def clock_axis(axis: Axes, time_zone: str) -> None:
    """Make the x axis one of the time of day in a zone."""
    zone = ZoneInfo(time_zone)
    axis.xaxis.set_major_locator(mdates.AutoDateLocator(tz=zone, minticks=3, maxticks=7))
    axis.xaxis.set_major_formatter(mdates.DateFormatter("%H:%M", tz=zone))
    axis.set_xlabel(f"Time of day ({time_zone})", color=MUTED)


def shorten(text: str, width: int = 22, most: int = 2) -> str:
    """Return a label broken over at most so many lines, and cut where it is longer still."""
    words, lines = typeset(text).split(), [""]
    for word in words:
        if lines[-1] and len(lines[-1]) + 1 + len(word) > width:
            lines.append("")
        lines[-1] = f"{lines[-1]} {word}".strip()
    kept = [line if len(line) <= width + 4 else line[:width + 3] + "…" for line in lines[:most]]
    return "\n".join(kept) + ("…" if len(lines) > most else "")


@styled
def png(figure: Figure) -> bytes:
    """Return the figure as PNG, the same bytes for the same figure."""
    buffer = io.BytesIO()
    with warnings.catch_warnings():
        # A label in a script that the font lacks is drawn as boxes; the table has it in full.
        warnings.filterwarnings("ignore", message="Glyph .* missing from font")
        warnings.filterwarnings("ignore", message="Matplotlib currently does not support")
        figure.savefig(buffer, format="png", dpi=DPI, metadata={"Software": None})
    small = io.BytesIO()  # 256 colours are plenty for a drawing, at a third of the bytes
    with Image.open(buffer) as drawn:
        drawn.convert("RGB").quantize(256, dither=Image.Dither.NONE).save(small, "png",
                                                                         optimize=True)
    return small.getvalue()


def show(*drawings: Drawing | Iterable[Drawing]) -> None:
    """Display drawings in a notebook, each as PNG with its alt text; a missing one as a sentence.

    Parameters
    ----------
    *drawings : Drawing or iterable of Drawing
        What the functions of `figures` return.
    """
    for drawing in drawings:
        if not isinstance(drawing, Drawing):
            show(*drawing)
        elif drawing.figure is None:
            display(paragraph(drawing.alt, "empty"))
        else:
            image = base64.b64encode(png(drawing.figure)).decode("ascii")
            alt, caption = typeset(drawing.alt), typeset(drawing.caption)
            display({"image/png": image, "text/plain": alt}, raw=True,
                    metadata={"image/png": {"alt": alt, "caption": caption}})
