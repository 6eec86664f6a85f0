"""Figures from inside the passes, over the dates, and the ramp of the maps."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import sample
import sample_more
from matplotlib import dates as mdates
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure

from surveykit.report import figures, style

T, LABELS = sample.tables(), sample.LABELS


def drawn(drawing: figures.Drawing) -> Figure:
    assert drawing.figure is not None
    assert drawing.caption.endswith(".")
    assert sum(map(str.isdigit, drawing.alt)) >= 4
    assert "nan" not in drawing.alt.lower().split()
    return drawing.figure


def test_places_are_drawn_with_their_probabilities() -> None:
    (drawing,) = figures.rank_plots(T["ranks"], LABELS)
    axis = drawn(drawing).axes[0]
    # by the sample: the court is first with 0.95, so it heads the rows
    assert [t.get_text() for t in axis.get_yticklabels()] == ["Coated court", "Worn asphalt"]
    assert [t.get_text().replace("\u00a0", " ") for t in axis.texts] == [
        "95 %", "5 %", "5 %", "95 %"]
    assert "Coated court place 1 with probability 0.95" in drawing.alt
    one = T["ranks"][T["ranks"]["surface"] == "coated-court"]
    assert figures.rank_plots(one)[0].figure is None


def test_heights_show_both_errors_of_the_worst_pass_with_used_and_best() -> None:
    (drawing,) = figures.height_plot(T["geometry"], LABELS)
    first, second = drawn(drawing).axes
    shade, foreign = first.lines[1].get_ydata(), first.lines[2].get_ydata()
    assert [*first.lines[0].get_ydata()] == pytest.approx([*(shade + foreign)])
    # hand arithmetic: at 50 cm 0.5 * 0.25 / 4 + 0.0001 / 0.25 = 0.03165; at 10 cm 0.01125
    marks = [(line.get_xdata()[0], line.get_ydata()[0]) for line in first.lines[3:]]
    assert marks == [pytest.approx((50, 3.165)), pytest.approx((10, 1.125))]
    assert second.get_title(loc="left") == "Lawn, L1-albedo-1"
    assert "best 1\u00a0% at 10 cm" in drawing.alt
    assert figures.height_plot(T["geometry"].iloc[:0]) == ()  # the table below says why


def test_cooling_is_drawn_down_from_the_touch() -> None:
    drawing = figures.cooling_plot(sample_more.cooling(), LABELS)
    (axis,) = drawn(drawing).axes
    # hand arithmetic: 0.5 sqrt(7.5) = 1.37 K
    assert axis.lines[1].get_ydata()[-1] == pytest.approx(-1.369, abs=1e-3)
    assert "0.50 K s⁻¹ᐟ² over 2 passes, so 1.4 K after 8 s" in drawing.alt
    assert figures.cooling_plot(pd.DataFrame()).alt.startswith("No contact placement")


def test_readings_that_leave_the_law_stay_in_sight() -> None:
    courses = sample_more.cooling().assign(below_k=-1.2)  # the ground warms under the head
    low, high = drawn(figures.cooling_plot(courses, LABELS)).axes[0].get_ylim()
    assert low < -1.369  # the law, as above
    assert high >= 1.2


def test_a_map_stands_at_the_places_walked_and_is_darker_where_higher() -> None:
    (drawing,) = figures.map_plots(sample_more.walked(), LABELS)
    points = drawn(drawing).axes[0].collections[0]
    place = np.asarray(points.get_offsets())
    assert place.min(axis=0) == pytest.approx([0.1, 0.5])
    assert place.max(axis=0) == pytest.approx([3.9, 3.5])
    points.update_scalarmappable()
    luminance = points.get_facecolors()[:, :3] @ [0.2126, 0.7152, 0.0722]
    assert np.corrcoef(place[:, 0], luminance)[0, 1] < -0.95
    assert figures.map_plots(pd.DataFrame()) == ()


def test_a_figure_that_has_no_room_for_all_says_how_many_there_are() -> None:
    many = pd.concat([sample_more.walked().assign(patch=f"L{n}") for n in range(8)])
    (drawing,) = figures.map_plots(many, LABELS)
    assert drawing.caption.endswith("darker is higher; the first 6 of 8 patches.")
    (few,) = figures.map_plots(sample_more.walked(), LABELS)
    assert few.caption.endswith("darker is higher.")
    hills = pd.concat([T["histograms"].assign(**{"pass": f"L{n}-standoff-1"}) for n in range(7)])
    assert figures.histogram_plots(hills)[0].caption.endswith("; the first 6 of 7 passes.")
    heights = pd.concat([T["geometry"].assign(surface=f"s{n}", **{"pass": f"p{n}"})
                         for n in range(9)])
    assert figures.height_plot(heights)[0].caption.endswith("; the first 6 of 9 patches.")


def test_the_ramp_is_one_hue_and_even_in_lightness() -> None:
    """CIE 015:2018, CIELAB of sRGB, by its formula written out once more (from memory)."""
    import colorsys

    for ramp in (style.RAMP, style.MAP_RAMP):
        colours = np.array([to_rgb(ramp(v)) for v in np.linspace(0, 1, 21)])
        linear = [sum(k * (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4)
                      for k, c in zip((0.2126, 0.7152, 0.0722), colour, strict=True))
                  for colour in colours]
        steps = np.diff([116 * y ** (1 / 3) - 16 for y in linear])
        assert (steps < 0).all()
        assert np.ptp(steps) < 0.25 * abs(steps.mean())
        hues = [colorsys.rgb_to_hls(*colour)[0] for colour in colours[5:]]
        assert np.ptp(hues) < 0.06


def test_a_histogram_holds_every_record() -> None:
    (drawing,) = figures.histogram_plots(T["histograms"], LABELS)
    (axis,) = drawn(drawing).axes
    assert sum(bar.get_height() for bar in axis.patches) == 139
    assert "L1-standoff-1, 139 records from 30.0 to 40.0\u00a0°C" in drawing.alt
    assert figures.histogram_plots(T["histograms"].iloc[:0]) == ()


def test_a_step_that_some_passes_lack_shifts_by_those_that_have_it() -> None:
    """Raw .10 and .20, darks +.01 each, surroundings +.02 on the first alone, own shade +.005:
    after surroundings .03 (not .13 less the mean of .15), from .150 to (.135 + .215) / 2 = .175."""
    steps = [("P1", "raw", 0.10), ("P1", "dark", 0.11), ("P1", "own shade", 0.115),
             ("P2", "raw", 0.20), ("P2", "dark", 0.21), ("P2", "surroundings", 0.23),
             ("P2", "own shade", 0.235)]
    frame = pd.DataFrame(steps, columns=["pass", "step", "value"]).assign(
        surface="lawn", quantity="albedo", kind="clear", unit="1")
    (drawing,) = figures.correction_plots(frame, LABELS)
    marks = {line.get_label(): line.get_xdata()[0] for line in drawn(drawing).axes[0].lines
             if str(line.get_label()).startswith("after")}
    assert marks == {"after dark": pytest.approx(0.01), "after own shade": pytest.approx(0.025),
                     "after surroundings": pytest.approx(0.03)}
    assert "Lawn 0.150 to 0.175" in drawing.alt


def test_a_surface_of_the_second_panel_alone_is_in_the_legend() -> None:
    rows = sample_more.series()
    other = rows.assign(surface="lawn", kind="diffuse")
    (drawing,) = figures.series_plots(pd.concat([rows, other]), LABELS)
    assert [text.get_text() for text in drawn(drawing).legends[0].get_texts()] == [
        "Coated court", "Lawn"]


def test_dates_of_two_years_keep_their_years() -> None:
    rows = sample_more.series()
    (drawing,) = figures.series_plots(rows.assign(date=["2024-07-24", "2025-06-12", "2025-07-24"]))
    axis = drawn(drawing).axes[0]
    assert [text.get_text() for text in axis.get_xticklabels()] == [
        "24 July\n2024", "12 June\n2025", "24 July\n2025"]
    (same,) = figures.series_plots(rows)
    assert drawn(same).axes[0].get_xlabel() == "Date in 2025"


def test_a_series_shows_its_dates_and_what_was_done_between() -> None:
    done = [{"date": "2025-05-20", "surface": "coated-court", "text": "pale coating laid"}]
    (drawing,) = figures.series_plots(sample_more.series(), LABELS, done)
    axis = drawn(drawing).axes[0]
    assert mdates.datestr2num("2025-05-20") in [line.get_xdata()[0] for line in axis.lines]
    assert "Dotted: 20 May 2025, Coated court: pale coating laid." in drawing.alt
    assert figures.series_plots(sample_more.series().iloc[:1]) == ()
