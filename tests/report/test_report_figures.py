"""Figures: what is drawn is what the tables hold, and the alt text says it in words."""

from __future__ import annotations

import struct

import numpy as np
import pandas as pd
import pytest
import sample
from matplotlib import dates as mdates
from matplotlib.figure import Figure

from surveykit.report import figures, style
from surveykit.report.wording import NO_BREAK

T, LABELS = sample.tables(), sample.LABELS
ALL = {
    "intervals": lambda t, lab: figures.interval_plots(t["surfaces"], lab),
    "matrices": lambda t, lab: figures.difference_matrices(t["differences"], lab),
    "changes": lambda t, lab: figures.change_plots(t["changes"], {"temperature": 1.0}, lab),
    "budget": lambda t, lab: figures.budget_plot(t["budget"], lab),
    "ledger": lambda t, lab: (figures.ledger_plot(t["ledger"]),),
    "ranks": lambda t, lab: figures.rank_plots(t["ranks"], lab),
    "heights": lambda t, lab: figures.height_plot(t["geometry"], lab),
    "day": lambda t, lab: (figures.day_timeline(
        t["passes"], sample.sky(), sample.weather(), "Europe/Lisbon", lab),),
}


def figure_of(drawing: figures.Drawing) -> Figure:
    assert drawing.figure is not None
    return drawing.figure


def words(figure: Figure) -> str:
    return " ".join(text.get_text() for axis in figure.axes for text in (
        axis.texts + [axis.title, axis.xaxis.label] + axis.get_yticklabels()
        + axis.get_xticklabels()))


@pytest.mark.parametrize("name", ALL)
def test_alt_texts_are_specific_and_hold_numbers(name: str) -> None:
    drawings = ALL[name](T, LABELS)
    alts = [drawing.alt for drawing in drawings]
    assert len({*alts}) == len(alts)
    for drawing in drawings:
        assert drawing.figure is not None
        assert sum(map(str.isdigit, drawing.alt)) >= 4
        assert 40 < len(drawing.alt) < 1200
        assert drawing.caption.endswith(".")
        assert "nan" not in drawing.alt.lower().split()


@pytest.mark.parametrize("name", ALL)
def test_nothing_to_draw_is_a_sentence_not_an_empty_figure(name: str) -> None:
    for drawing in ALL[name](sample.empty_tables(), LABELS):
        assert drawing.figure is None
        assert drawing.alt.endswith(".")
        assert drawing.alt.startswith("No ")


@pytest.mark.parametrize("name", ALL)
def test_hostile_labels_draw_without_a_warning_and_the_same_twice(name: str) -> None:
    # warnings are errors here; "$x_1$" must stay text, the last label has no glyphs in the font
    labels = {**sample.HOSTILE, "worn-asphalt": "\u8336 {} $\\frac{ \\"}
    one, two = ALL[name](T, labels), ALL[name](T, labels)
    for first, second in zip(one, two, strict=True):
        assert style.png(figure_of(first)) == style.png(figure_of(second))


@pytest.mark.parametrize("name", ALL)
def test_no_legend_is_cut_off_beside_long_labels(name: str) -> None:
    labels = {key: "Court before the pale coating" for key in LABELS}
    for drawing in ALL[name](T, labels):
        figure = figure_of(drawing)
        style.png(figure)  # lays it out
        for legend in [*figure.legends, *filter(None, (a.get_legend() for a in figure.axes))]:
            box = legend.get_window_extent()
            assert box.x0 >= -0.5
            assert box.x1 <= figure.bbox.width + 0.5


def test_intervals_are_drawn_where_the_table_says() -> None:
    figure = figure_of(figures.interval_plots(T["surfaces"], LABELS)[0])
    contact, standoff = figure.axes
    bars = sorted(tuple(line.get_xdata()) for line in contact.lines if len(line.get_xdata()) == 2)
    assert bars == [pytest.approx((45.75, 50.11)), pytest.approx((48.46, 51.28)),
                    pytest.approx((57.12, 59.56))]  # value -+ U of the sample
    assert [t.get_text() for t in contact.texts] == ["not evaluated"]
    assert contact.get_xlim() == standoff.get_xlim()
    markers = {line.get_marker() for axis in figure.axes for line in axis.lines} - {"|"}
    assert len(markers) == 2  # a marker of its own for each kind
    assert figure.axes[-1].get_xlabel() == "Temperature, °C"


def test_a_value_without_interval_is_hollow_and_has_no_bar() -> None:
    frame = T["surfaces"][T["surfaces"]["status"] == "value only"]
    axis = figure_of(figures.interval_plots(frame, LABELS)[0]).axes[0]
    (mark,) = axis.lines
    assert [*mark.get_xdata()] == [36.48]
    assert mark.get_markerfacecolor() == axis.get_facecolor()


def test_matrix_is_row_minus_column_with_the_verdict() -> None:
    figure = figure_of(figures.difference_matrices(T["differences"], LABELS)[2])
    told = {text.get_text() for text in figure.axes[0].texts}
    assert "−0.185\nlower" in told  # 0.1023 - 0.2871, asphalt against court
    assert "−0.014\nlower, small" in told
    assert "not evaluated" in told


def test_matrix_turns_a_pair_named_the_other_way_round() -> None:
    rows = T["differences"][(T["differences"]["quantity"] == "ndvi")].copy()
    first = rows.iloc[[0]].assign(surface="a", other="b", difference=0.2, verdict="higher")
    second = rows.iloc[[0]].assign(surface="b", other="c", difference=0.1, verdict="higher")
    third = rows.iloc[[0]].assign(surface="c", other="a", difference=-0.3, verdict="lower")
    figure = figure_of(figures.difference_matrices(pd.concat([first, second, third]))[0])
    # order a, b, c: the cell (a, c) shows a - c = +0.3, higher
    assert {text.get_text() for text in figure.axes[0].texts} == {
        "+0.200\nhigher", "+0.100\nhigher", "+0.300\nhigher"}


def test_changes_show_the_relevant_band_and_only_judged_rows() -> None:
    drawing = figures.change_plots(T["changes"], {"temperature": 1.0}, LABELS)[0]
    axis = figure_of(drawing).axes[0]
    band = axis.patches[0].get_extents().transformed(axis.transData.inverted())
    assert (band.x0, band.x1) == pytest.approx((-1.0, 1.0))
    marks = [line.get_xdata()[0] for line in axis.lines if len(line.get_xdata()) == 1]
    assert sorted(marks) == [-7.94, 0.34]  # the additive and the raw row are not drawn
    assert axis.get_xlim()[0] == -axis.get_xlim()[1]
    assert "not comparable" in words(figure_of(drawing))
    assert f"Coated court −7.9{NO_BREAK}±{NO_BREAK}1.6{NO_BREAK}K lower" in drawing.alt


def test_the_way_of_the_records_goes_down_to_those_used() -> None:
    drawing = figures.ledger_plot(T["ledger"])
    axis = figure_of(drawing).axes[0]  # rednir: 2160 logged, 1227 outside, 3 unreadable, 930 used
    bars = [(round(bar.get_x() * 21.6), round(bar.get_width() * 21.6)) for bar in axis.patches]
    assert bars == [(0, 2160), (933, 1227), (930, 3), (0, 930)]
    assert [t.get_text() for t in axis.get_yticklabels()] == [
        "logged", "outside passes", "unreadable line", "used"]
    assert f"43{NO_BREAK}% used" in drawing.alt  # 930 of 2160


def test_many_reasons_are_merged_without_losing_a_record() -> None:
    rows = pd.concat([T["ledger"].iloc[[1]].assign(reason=f"reason {n}", records=10 + n)
                      for n in range(20)] + [T["ledger"].iloc[[0, 3]]])
    axis = figure_of(figures.ledger_plot(rows)).axes[0]
    names = [text.get_text() for text in axis.get_yticklabels()]
    assert names == ["logged", "outside passes", *(f"reason {n}" for n in range(19, 15, -1)),
                     "other reasons", "used"]
    lost = [bar.get_width() for bar in axis.patches][1:]
    assert sum(lost) == pytest.approx(100.0)


def test_budget_keeps_each_surfaces_shares() -> None:
    drawings = figures.budget_plot(T["budget"], LABELS)
    axis = figure_of(drawings[2]).axes[0]  # NDVI: shares 0.62, 0.25, 0.13
    assert sorted({round(bar.get_width(), 6) for bar in axis.patches}) == [13.0, 25.0, 62.0]
    assert f"Lawn 62{NO_BREAK}% between passes" in drawings[2].alt


def test_the_day_stands_at_its_own_times_and_crosses_what_failed() -> None:
    drawing = figures.day_timeline(T["passes"], sample.sky(), sample.weather(), "Europe/Lisbon")
    top, light, sun, air = figure_of(drawing).axes
    first = min(bar.get_x() for bar in top.patches if bar.get_width() > 0)
    assert mdates.num2date(first).strftime("%H:%M") == "10:05"  # UTC
    assert sum(len(line.get_xdata()) for line in top.lines) == 2  # two refused passes
    assert sun.lines[0].get_ydata().max() == pytest.approx(68.0, abs=0.1)  # 90 - 22
    assert len(air.lines[0].get_xdata()) == 5  # read between 10:05 and 15:10 UTC, one missing
    assert "Irradiance, W m⁻²" in light.get_title(loc="left")
    assert "from 11:05 to 16:09 (Europe/Lisbon)" in drawing.alt
    assert "2 passes could not be evaluated" in drawing.alt


def test_long_series_are_thinned_to_means() -> None:
    # 20 Hz over six hours: means over equal stretches keep a straight line straight
    time = pd.date_range("2025-07-24 10:00", periods=200_000, freq="100ms", tz="UTC", unit="ns")
    sky = pd.DataFrame({"time_utc": time, "irradiance_w_m2": np.linspace(600, 900, len(time)),
                        "zenith_deg": 30.0})
    axis = figure_of(figures.day_timeline(T["passes"], sky)).axes[1]
    x, y = axis.lines[0].get_data()
    assert len(x) <= 601
    assert np.abs(np.diff(y, 2)[1:-1]).max() < 0.02


def test_the_day_stands_alone_without_sky_and_weather() -> None:
    assert len(figure_of(figures.day_timeline(T["passes"])).axes) == 1
    empty = sample.weather().iloc[:0]
    assert len(figure_of(figures.day_timeline(T["passes"], sample.sky(), empty)).axes) == 3


def test_show_hands_over_png_alt_and_caption(monkeypatch: pytest.MonkeyPatch) -> None:
    shown: list[tuple[object, dict]] = []
    monkeypatch.setattr("surveykit.report.style.display", lambda x, **k: shown.append((x, k)))
    drawings = figures.interval_plots(T["surfaces"], LABELS)
    figures.show(drawings, figures.ledger_plot(sample.empty_tables()["ledger"]))
    assert len(shown) == 4
    about = shown[0][1]["metadata"]["image/png"]
    assert (about["alt"], about["caption"]) == (drawings[0].alt, drawings[0].caption)
    width, _ = struct.unpack(">II", style.png(figure_of(drawings[0]))[16:24])
    assert width == round(style.WIDTH_IN * style.DPI)
    assert "No record was logged" in repr(shown[3][0])
