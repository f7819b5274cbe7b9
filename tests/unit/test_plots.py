"""The figures: what they return, what they write, and that they can be read in grey."""

import itertools
import math
from datetime import UTC, datetime
from functools import cache

import matplotlib as mpl
import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from magion.answers.day import DayAnswer, DayFrequency, Switch
from magion.answers.pattern import answer_antenna
from magion.answers.sky import answer_sky
from magion.errors import InputError
from magion.formats.station import read_station, station_of
from magion.geometry import Place
from magion.plots.antenna import antenna_figure, plot_elevation, plot_sky
from magion.plots.day import (
    day_figure,
    plot_day_absorption,
    plot_day_frequencies,
    plot_day_split,
    plot_day_states,
)
from magion.plots.saving import encoded, require_ending
from magion.plots.sense import plot_sense, sense_figure
from magion.plots.sky import on_disc, sky_axes
from tests.demo import CEDAR, LARCH, STATIONS

WHEN = datetime(2026, 6, 21, tzinfo=UTC)
FINE = np.arange(1.0, 91.0), np.arange(0.0, 360.0, 3.0)


def day(mhz=(5.3,), labels=("left", "right"), name="Larch Hut", n=96, states=None, error=0.6):
    """A day by hand, with waves of every state in turn; nothing is traced."""
    hours = np.arange(n) * 24.0 / n
    swing = np.cos((hours - 12.0) * math.pi / 12.0)
    fof2 = 6.5 + 3.0 * swing
    both = np.stack([fof2, fof2 + 0.6])
    rows = []
    for k, f in enumerate(mhz):
        if states is None:
            pattern = ("none", "extraordinary_only", "both", "ordinary_only", "both", "unknown")
            state = tuple(pattern[(6 * i // n + k) % 6] for i in range(n))
        else:
            state = (states,) * n
        there = np.array(
            [
                [s in ("both", "ordinary_only") for s in state],
                [s in ("both", "extraordinary_only") for s in state],
            ]
        )
        receive = tuple(labels[i // 7 % 2] if there[:, i].any() else None for i in range(n))
        rows.append(
            DayFrequency(
                frequency_mhz=f,
                state=state,
                probability=np.full((4, n), 0.25),
                elevation_deg=np.where(there, 80.0 + both, np.nan),
                azimuth_deg=np.where(there, np.stack([swing + 359.0, swing + 1.0]) % 360.0, np.nan),
                group_delay_ms=np.where(there, both / 5.0, np.nan),
                absorption_db=np.where(there, 20.0 + 15.0 * np.stack([swing, 2.0 * swing]), np.nan),
                level_db=np.where(there, -20.0, np.nan),
                axial_ratio_db=np.where(there, 1.0, np.nan),
                receive_hand=(("LHCP",) * n, ("RHCP",) * n),
                wave=("ordinary",) * n,
                receive=receive,
                transmit=receive,
                rejection_db=np.full(n, 20.0),
                changes=(),
                plan=(
                    Switch(
                        time_utc="2026-06-21T00:00:00Z",
                        plus_minus_min=None,
                        wave=None,
                        receive=None,
                        transmit=None,
                        reason="start",
                    ),
                ),
            )
        )
    return DayAnswer(
        schema="magion/day/1",
        transmitter="Scree Hut (47.10, 10.85)",
        receiver=f"{name} (46.50, 11.35)",
        distance_km=77.0,
        date="2026-06-21",
        station=name,
        source="by hand",
        time_utc=tuple(f"2026-06-21T{int(h):02d}:00:00Z" for h in hours),
        hours=hours,
        solar_hour_offset=-4.75,
        solar_zenith_deg=90.0 - 60.0 * swing,
        fof2_mhz=fof2,
        fxf2_mhz=fof2 + 0.6,
        fof2_error_mhz=np.full(n, error),
        foe_mhz=np.full(n, 3.0),
        muf_mhz=1.1 * both,
        frequencies=tuple(rows),
        caveats=(),
    )


CROWDED = (1.85, 3.65, 3.7, 5.3, 5.36, 5.4, 7.1, 7.15, 10.1, 10.12, 14.1, 28.0)
DAYS = {
    "one frequency": day,
    "four frequencies": lambda: day((3.65, 5.3, 7.1, 10.1)),
    "twelve, some of them close": lambda: day(CROWDED),
    "no wave": lambda: day((28.0,), states="none"),
    "no readings and no uncertainty": lambda: day((5.3,), states="unknown", error=math.nan),
    "long labels": lambda: day((5.3,), ("left hand of O".ljust(20, "x"), "r" * 20), "H" * 60),
}
STATION_FILES = {
    "demo": lambda: (read_station(LARCH), 5.3),
    "southern": lambda: (read_station(CEDAR), 7.1),
    "half-wave line": lambda: (station_of(STATIONS["half-wave line"], "x"), 5.3),
    "loops": lambda: (station_of(STATIONS["loops"], "x"), 1.85),
    "single dipole": lambda: (station_of(STATIONS["single dipole"], "x"), 5.3),
    "long names": lambda: (station_of(STATIONS["long names"], "x"), 5.3),
}
SKIES = {
    "demo": (46.50, 11.35, 5.3),
    "low frequency": (46.50, 11.35, 1.85),
    "southern": (-41.0, -71.3, 7.1),
    "dip equator": (10.0, 5.0, 7.1),
    "magnetic pole": (85.8, 139.2, 14.1),
}


@cache
def antenna(name):
    station, mhz = STATION_FILES[name]()
    return answer_antenna(station, mhz, *FINE)


@cache
def sky(name):
    latitude, longitude, mhz = SKIES[name]
    return answer_sky(Place(latitude_deg=latitude, longitude_deg=longitude), mhz, WHEN)


FIGURES = [
    *[pytest.param(lambda c=c: day_figure(DAYS[c]()), id=f"day, {c}") for c in DAYS],
    *[
        pytest.param(lambda c=c: antenna_figure(antenna(c)), id=f"antenna, {c}")
        for c in STATION_FILES
    ],
    *[pytest.param(lambda c=c: sense_figure(sky(c)), id=f"sense, {c}") for c in SKIES],
]
PLOTS = {
    "day frequencies": (plot_day_frequencies, day, ()),
    "day states": (plot_day_states, day, ()),
    "day elevations": (plot_day_split, day, ("elevation_deg",)),
    "day azimuths": (plot_day_split, day, ("azimuth_deg",)),
    "day delays": (plot_day_split, day, ("group_delay_ms",)),
    "day absorption": (plot_day_absorption, day, ()),
    "elevation": (plot_elevation, lambda: antenna("demo"), ()),
    "sky": (plot_sky, lambda: antenna("demo"), ("right",)),
    "sense": (plot_sense, lambda: sky("demo"), ()),
}


@pytest.fixture(scope="module", params=FIGURES)
def figure(request):
    """Every figure once, drawn."""
    made = request.param()
    FigureCanvasAgg(made).draw()
    return made


@pytest.mark.parametrize("name", PLOTS)
def test_a_plot_takes_a_record_and_perhaps_axes_and_returns_them(name):
    plot, record, more = PLOTS[name]
    answer = record()
    alone = plot(answer, *more)
    assert isinstance(alone.figure, Figure)
    given = Figure().add_subplot()
    assert plot(answer, *more, ax=given) is given
    assert len(given.figure.axes) == 1


@pytest.mark.parametrize("name", PLOTS)
def test_a_plot_has_a_title_and_units(name):
    plot, record, more = PLOTS[name]
    ax = plot(record(), *more)
    title = ax.get_title()
    assert title
    if ax.axison:
        assert "[" in ax.get_ylabel()
    else:  # a disc of the sky
        assert "[dB]" in title
        assert {"N", "E", "S", "W", "30°", "60°"} <= {t.get_text() for t in ax.texts}


def test_the_day_has_a_common_time_axis_with_units():
    figure = day_figure(day((3.65, 5.3), n=12))
    figure.draw_without_rendering()
    panels = figure.axes
    assert len(panels) == 6
    assert panels[-1].get_xlabel() == "UTC [h]"
    assert {ax.get_xlim() for ax in panels} == {(0.0, 24.0)}
    (solar,) = panels[0].child_axes
    assert solar.get_xlabel() == "local solar time at the midpoint [h]"
    assert np.subtract(solar.get_xlim(), panels[0].get_xlim()) == pytest.approx([-4.75, -4.75])
    legend = [t.get_text() for t in figure.legends[0].get_texts()]
    assert legend == ["3.65 MHz", "5.3 MHz"]


def test_states_have_letters_and_hatches():
    """Meaning never hangs on the shade."""
    ax = plot_day_states(day())
    assert {"B", "X", "O", "–", "?"} <= {t.get_text() for t in ax.texts}
    assert {c.get_hatch() for c in ax.collections} >= {"////", "....", "xxx"}
    for words in ("B both waves", "X only", "O only", "– neither", "? no readings"):
        assert words in ax.get_title()


def test_a_frequency_above_the_figure_is_told():
    ax = plot_day_frequencies(day((28.0,), states="none"))
    assert "28 ↑" in [t.get_text() for t in ax.texts]


def texts_of(ax):
    """Every visible text of an Axes, of the axes within it and of its legend."""
    found = [*ax.texts, ax.title]
    if ax.axison:
        for axis, (low, high) in ((ax.xaxis, ax.get_xlim()), (ax.yaxis, ax.get_ylim())):
            ticks = zip(axis.get_ticklocs(), axis.get_ticklabels(), strict=False)
            found += [axis.label, *(t for at, t in ticks if low <= at <= high)]
    legend = ax.get_legend()
    if legend is not None:
        found += [*legend.get_texts(), legend.get_title()]
    for child in ax.child_axes:
        found += texts_of(child)
    return [t for t in found if t.get_visible() and t.get_text().strip()]


def test_no_two_texts_overlap(figure):
    renderer = figure.canvas.get_renderer()
    for ax in figure.axes:
        boxes = [(t.get_text(), t.get_window_extent(renderer)) for t in texts_of(ax)]
        assert boxes
        for (one, a), (other, b) in itertools.combinations(boxes, 2):
            wide = min(a.x1, b.x1) - max(a.x0, b.x0)
            high = min(a.y1, b.y1) - max(a.y0, b.y0)
            assert not (wide > 1.0 and high > 1.0), f"{one!r} lies on {other!r}"


def test_every_text_is_within_the_figure(figure):
    renderer = figure.canvas.get_renderer()
    outer = figure.bbox
    every = [t for ax in figure.axes for t in texts_of(ax)]
    every += [figure._suptitle] if figure._suptitle else []
    for text in every:
        box = text.get_window_extent(renderer)
        assert box.x0 >= outer.x0 - 1.0, text.get_text()
        assert box.x1 <= outer.x1 + 1.0, text.get_text()


def test_figures_are_grey(figure):
    pixels = np.asarray(figure.canvas.buffer_rgba()).astype(int)
    assert np.ptp(pixels[..., :3], axis=-1).max() <= 1
    assert pixels[..., :3].min() < 40
    assert np.mean(pixels[..., :3] > 200) > 0.5  # black on white


@pytest.mark.parametrize("kind", ["png", "svg", "pdf"])
def test_a_figure_gives_the_same_bytes_twice(kind):
    start = {"png": b"\x89PNG", "svg": b"<?xml", "pdf": b"%PDF"}[kind]
    for plot, record, more in (PLOTS["day states"], PLOTS["sky"], PLOTS["day frequencies"]):
        answer = record()
        first, second = (encoded(plot(answer, *more).figure, kind) for _ in range(2))
        assert first.startswith(start)
        assert first == second


def test_text_of_an_svg_is_text():
    found = encoded(sense_figure(sky("demo")), "svg").decode("utf-8")
    assert ">magnetic N<" in found
    assert "<dc:date>" not in found


def test_settings_of_matplotlib_are_left_as_they_were():
    before = dict(mpl.rcParams)
    encoded(sense_figure(sky("demo")), "svg")
    assert dict(mpl.rcParams) == before


@pytest.mark.parametrize("name", ["sky.gif", "sky", "sky.", ".png", "sky.png.txt", "sky.\x07"])
def test_other_endings_are_refused(name):
    with pytest.raises(InputError, match=r"accepted: \.png, \.svg or \.pdf"):
        require_ending(name)


@pytest.mark.parametrize(("name", "kind"), [("a.png", "png"), ("a.b.SVG", "svg"), ("x.Pdf", "pdf")])
def test_endings_in_any_case(name, kind):
    assert require_ending(name) == kind


def test_the_disc_has_north_up_and_east_to_the_right():
    x, y = on_disc([0.0, 90.0, 180.0, 270.0, 45.0], [0.0, 0.0, 0.0, 0.0, 90.0])
    assert x == pytest.approx([0.0, 90.0, 0.0, -90.0, 0.0], abs=1e-9)
    assert y == pytest.approx([90.0, 0.0, -90.0, 0.0, 0.0], abs=1e-9)
    where = {t.get_text(): t.get_position() for t in sky_axes().texts}
    assert where["N"][1] > 90.0 > where["W"][0]
    assert where["E"][0] > 90.0


def test_the_favoured_hand_is_named_where_it_is_favoured():
    """The label R on the disc stands where RHCP is the stronger, and L the other way."""
    for label, letter in (("left", "L"), ("right", "R")):
        ax = plot_sky(antenna("demo"), label)
        levels = [t.get_text() for t in ax.texts if t.get_text()[-1].isdigit()]
        assert levels
        assert {text[0] for text in levels} == {letter}
    pattern = antenna("single dipole")
    ax = plot_sky(pattern)
    for text in ax.texts:
        words = text.get_text().split()
        if len(words) == 2 and words[0] in "RL":
            x, y = text.get_position()
            j = round(math.degrees(math.atan2(x, y)) % 360.0 / 3.0) % 120
            i = int(np.clip(round(90.0 - np.hypot(x, y)) - 1, 0, 89))
            assert (pattern.positions[0].right_over_left_db[i, j] > 0.0) == (words[0] == "R")
