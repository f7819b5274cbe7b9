"""The day of a path as one figure: several panels on a common time axis."""

import math
import textwrap
from typing import TYPE_CHECKING, Any

import numpy as np

from magion.answers.day import DayAnswer

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_LOOKS = {
    "both": ("1.0", "", "B"),
    "extraordinary_only": ("0.72", "////", "X"),
    "ordinary_only": ("0.88", "....", "O"),
    "none": ("0.45", "", "–"),
    "unknown": ("1.0", "xxx", "?"),
}
_SUNSET_ZENITH_DEG = 90.833
_STYLES = ("-", "--", "-.", ":")
_GREYS = ("0.0", "0.35", "0.55")


def _edges(answer: DayAnswer) -> np.ndarray:
    step = answer.hours[1] - answer.hours[0] if answer.hours.size > 1 else 24.0
    edges = np.clip(np.append(answer.hours, answer.hours[-1] + step) - 0.5 * step, 0.0, 24.0)
    edges[-1] = 24.0
    return np.asarray(edges)


def _time_axis(answer: DayAnswer, ax: "Axes") -> None:
    ax.set_xlim(0.0, 24.0)
    ax.set_xticks(range(0, 25, 3), [f"{h:02d}" for h in range(0, 25, 3)])
    night = answer.solar_zenith_deg > _SUNSET_ZENITH_DEG
    for first, last in _runs(night):
        edges = _edges(answer)
        ax.axvspan(edges[first], edges[last + 1], color="0.93", zorder=0, linewidth=0)


def _runs(flags: np.ndarray) -> list[tuple[int, int]]:
    """First and last index of every run of true."""
    padded = np.concatenate([[False], flags, [False]]).astype(int)
    starts = np.flatnonzero(np.diff(padded) == 1)
    ends = np.flatnonzero(np.diff(padded) == -1) - 1
    return list(zip(starts.tolist(), ends.tolist(), strict=True))


def _new_axes(height: float) -> "Axes":
    from matplotlib.figure import Figure

    return Figure(figsize=(6.0, height), layout="constrained").add_subplot()


def _style(k: int) -> tuple[str, str]:
    return _STYLES[k % len(_STYLES)], _GREYS[k // len(_STYLES) % len(_GREYS)]


def plot_day_frequencies(answer: DayAnswer, ax: "Axes | None" = None) -> "Axes":
    """Critical frequencies with their uncertainty, MUFs, operating frequencies.

    Parameters
    ----------
    answer : DayAnswer
        The day.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    ax = _new_axes(3.0) if ax is None else ax
    hours, error = answer.hours, np.nan_to_num(answer.fof2_error_mhz)
    for values, shade, line, name in (
        (answer.fof2_mhz, "0.70", "-", "foF2 ± 1σ"),
        (answer.fxf2_mhz, "0.84", "--", "fxF2 ± 1σ"),
    ):
        ax.fill_between(hours, values - error, values + error, color=shade, alpha=0.6, linewidth=0)
        ax.plot(hours, values, line, color="0.35", linewidth=1.2, label=name)
    ax.plot(hours, answer.muf_mhz[0], "-", color="black", linewidth=2.0, label="MUF O")
    ax.plot(hours, answer.muf_mhz[1], "--", color="black", linewidth=2.0, label="MUF X")
    top = np.nanmax([answer.muf_mhz.max(initial=0.0, where=np.isfinite(answer.muf_mhz)), 1.0])
    marks = [f.frequency_mhz for f in answer.frequencies]
    ax.set_ylim(0.0, 1.12 * max([float(top), *[m for m in marks if m < 2.0 * top]]))
    ceiling = ax.get_ylim()[1]
    for k, mark in enumerate(marks):
        line, grey = _style(k)
        if mark <= ceiling:
            ax.axhline(mark, linestyle=line, color=grey, linewidth=1.0)
    for mark, height in _spread_out(marks, ceiling):
        ax.annotate(
            f"{mark:g}" if mark <= ceiling else f"{mark:g} ↑",
            (24.0, height),
            xytext=(3, 0),
            textcoords="offset points",
            va="center",
            fontsize=8,
            annotation_clip=False,
        )
    ax.set_ylabel("frequency [MHz]")
    ax.set_title("critical frequencies, MUFs, operating frequencies", fontsize=8, pad=3)
    ax.legend(loc="lower center", fontsize=7.5, ncols=4, framealpha=0.9)
    _time_axis(answer, ax)
    return ax


def _spread_out(marks: list[float], ceiling: float) -> list[tuple[float, float]]:
    """Marks from below, and heights for their names that leave each a line of text."""
    line = 0.055 * ceiling
    placed: list[tuple[float, float]] = []
    for mark in sorted(marks):
        least = placed[-1][1] + line if placed else 0.0
        placed.append((mark, max(min(mark, ceiling), least)))
    # What was pushed out above goes down again.
    most = ceiling
    for i in range(len(placed) - 1, -1, -1):
        placed[i] = (placed[i][0], min(placed[i][1], most))
        most = placed[i][1] - line
    return placed


def plot_day_states(answer: DayAnswer, ax: "Axes | None" = None) -> "Axes":
    """Which waves arrive, and the relay position to use, as strips with letters.

    Parameters
    ----------
    answer : DayAnswer
        The day.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    ax = _new_axes(0.6 + 0.55 * len(answer.frequencies)) if ax is None else ax
    edges = _edges(answer)
    for k, f in enumerate(answer.frequencies):
        bottom = len(answer.frequencies) - 1 - k
        for first, last, name in _constant_runs(f.state):
            grey, hatch, letter = _LOOKS[name or "unknown"]
            width = edges[last + 1] - edges[first]
            ax.broken_barh(
                [(edges[first], width)],
                (bottom + 0.50, 0.42),
                facecolor=grey,
                edgecolor="black",
                hatch=hatch,
                linewidth=0.6,
            )
            if width >= 0.7:
                _tag(ax, edges[first] + 0.5 * width, bottom + 0.71, letter)
        for first, last, label in _constant_runs(f.receive):
            if label is None:
                continue
            width = edges[last + 1] - edges[first]
            ax.broken_barh(
                [(edges[first], width)],
                (bottom + 0.08, 0.36),
                facecolor="white",
                edgecolor="black",
                linewidth=0.6,
            )
            shown = _short(label, width)
            if shown:
                _tag(ax, edges[first] + 0.5 * width, bottom + 0.26, shown)
    ax.set_ylim(0.0, len(answer.frequencies))
    ax.set_yticks(
        [len(answer.frequencies) - 0.5 - k for k in range(len(answer.frequencies))],
        [f"{f.frequency_mhz:g}" for f in answer.frequencies],
    )
    ax.set_ylabel("f [MHz]")
    ax.set_title(_states_key(answer), fontsize=8, pad=3)
    ax.tick_params(axis="y", length=0)
    _time_axis(answer, ax)
    return ax


def _short(label: str, width: float) -> str:
    """As much of a relay label as fits into some hours."""
    room = int(width / 0.42)
    if len(label) <= room:
        return label
    return label[:1] if width >= 0.45 else ""


def _tag(ax: "Axes", x: float, y: float, text: str) -> None:
    ax.text(
        x,
        y,
        text,
        ha="center",
        va="center_baseline",
        fontsize=8,
        bbox={"boxstyle": "round,pad=0.08", "facecolor": "white", "edgecolor": "none"},
        clip_on=True,
    )


def _constant_runs(values: tuple[str | None, ...]) -> list[tuple[int, int, str | None]]:
    runs, start = [], 0
    for i in range(1, len(values) + 1):
        if i == len(values) or values[i] != values[start]:
            runs.append((start, i - 1, values[start]))
            start = i
    return runs


def plot_day_split(answer: DayAnswer, quantity: str, ax: "Axes | None" = None) -> "Axes":
    """What the extraordinary wave is away from the ordinary one.

    Parameters
    ----------
    answer : DayAnswer
        The day.
    quantity : str
        "elevation_deg", "azimuth_deg" or "group_delay_ms".
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on.
    """
    ax = _new_axes(1.6) if ax is None else ax
    some = False
    for k, f in enumerate(answer.frequencies):
        values = getattr(f, quantity)
        split = values[1] - values[0]
        if quantity == "azimuth_deg":
            split = (split + 180.0) % 360.0 - 180.0
        line, grey = _style(k)
        some |= bool(np.isfinite(split).any())
        ax.plot(
            answer.hours, split, line, color=grey, linewidth=1.4, label=f"{f.frequency_mhz:g} MHz"
        )
    ax.axhline(0.0, color="0.5", linewidth=0.6)
    name, unit = {
        "elevation_deg": ("elevation", "°"),
        "azimuth_deg": ("azimuth", "°"),
        "group_delay_ms": ("delay", "ms"),
    }[quantity]
    ax.set_ylabel(f"X − O [{unit}]")
    ax.set_title(f"{name} of the extraordinary less that of the ordinary wave", fontsize=8, pad=3)
    if not some:
        ax.set_ylim(-1.0, 1.0)
        ax.set_yticks([0.0])
        ax.text(12.0, 0.1, "never both waves", ha="center", va="bottom", fontsize=8)
    _time_axis(answer, ax)
    return ax


def plot_day_absorption(answer: DayAnswer, ax: "Axes | None" = None) -> "Axes":
    """Absorption of both waves.

    Parameters
    ----------
    answer : DayAnswer
        The day.
    ax : Axes, optional
        Where to draw; else a new figure.

    Returns
    -------
    Axes
        What was drawn on: of every frequency the ordinary wave thin, the
        extraordinary thick.
    """
    ax = _new_axes(1.6) if ax is None else ax
    greatest: float | None = None
    for k, f in enumerate(answer.frequencies):
        line, grey = _style(k)
        for i, width in enumerate((0.9, 2.2)):
            values = f.absorption_db[i]
            name = f"{f.frequency_mhz:g} MHz, {'OX'[i]}"
            ax.plot(answer.hours, values, line, color=grey, linewidth=width, label=name)
            if np.isfinite(values).any():
                greatest = max(greatest or 0.0, float(np.nanmax(values)))
    if greatest is None:
        ax.set_yticks([0.0])
        ax.text(12.0, 0.5, "no wave arrives", ha="center", va="center", fontsize=8)
    ax.set_ylim(0.0, 1.08 * max(greatest or 0.0, 1.0))
    ax.set_ylabel("loss [dB]")
    ax.set_title("absorption: ordinary thin, extraordinary thick", fontsize=8, pad=3)
    _time_axis(answer, ax)
    return ax


def day_figure(answer: DayAnswer) -> "Figure":
    """All panels of the day.

    Parameters
    ----------
    answer : DayAnswer
        The day.

    Returns
    -------
    Figure
        The figure.
    """
    from matplotlib.figure import Figure

    count = len(answer.frequencies)
    heights = [2.9, 0.35 + 0.55 * count, 1.15, 1.15, 1.15, 1.3]
    figure = Figure(figsize=(6.0, sum(heights) + 2.4 + 0.2 * (count > 1)), layout="constrained")
    ends = f"{answer.transmitter} to {answer.receiver}, {answer.distance_km:.0f} km"
    figure.suptitle(
        f"{textwrap.fill(ends, 62)}\n"
        f"{answer.date}, UTC; grey: sun below the horizon at the midpoint",
        fontsize=10 if len(ends) <= 62 else 8,
    )
    panels = figure.subplots(6, 1, sharex=True, gridspec_kw={"height_ratios": heights})
    plot_day_frequencies(answer, panels[0])
    plot_day_states(answer, panels[1])
    for ax, quantity in zip(
        panels[2:5], ("elevation_deg", "azimuth_deg", "group_delay_ms"), strict=True
    ):
        plot_day_split(answer, quantity, ax)
    if count > 1:
        handles, names = panels[2].get_legend_handles_labels()
        figure.legend(handles, names, loc="outside lower center", fontsize=7.5, ncols=min(count, 4))
    plot_day_absorption(answer, panels[5])
    panels[5].set_xlabel("UTC [h]")
    _solar_axis(answer, panels[0])
    figure.align_ylabels(panels)
    return figure


def _states_key(answer: DayAnswer) -> str:
    used = {s for f in answer.frequencies for s in f.state}
    words = {
        "both": "B both waves",
        "extraordinary_only": "X only",
        "ordinary_only": "O only",
        "none": "– neither",
        "unknown": "? no readings",
    }
    states = ", ".join(text for name, text in words.items() if name in used)
    below = "relay position to receive on" if answer.station else "hand to receive"
    return f"{states}; below: {below}"


def _shift(by: float) -> Any:
    return lambda hour: hour + by


def _solar_axis(answer: DayAnswer, ax: "Axes") -> None:
    offset = answer.solar_hour_offset
    top = ax.secondary_xaxis("top", functions=(_shift(offset), _shift(-offset)))
    first = 3 * math.ceil(offset / 3.0)
    ticks = [t for t in range(first, first + 28, 3) if offset <= t <= 24.0 + offset]
    top.set_xticks(ticks, [f"{t % 24:02d}" for t in ticks])
    top.tick_params(labelsize=8)
    top.set_xlabel("local solar time at the midpoint [h]", fontsize=8)
