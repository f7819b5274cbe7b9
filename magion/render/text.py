"""Records as text: 80 columns, black on white, rounded to what the physics supports."""

import re
import textwrap
from collections.abc import Callable

from magion.answers.point import FieldAnswer, OneWave, WaveAnswer
from magion.answers.reception import AntennaOnPath
from magion.answers.records import End, PathAnswer, RayAnswer, WaveOnPath
from magion.antenna.response import GREATEST_REJECTION_DB
from magion.polarization import Hand, hand_in_words

WIDTH = 80
_LABEL = 26
_COLUMN = 27
_HELD = "\N{NO-BREAK SPACE}"

_ASCII = str.maketrans(
    {
        "°": " deg",
        "·": ".",
        "−": "-",
        "–": "-",
        "×": "x",
        "²": "2",
        "³": "3",
        "θ": "theta",
        "μ": "mu",
        "χ": "chi",
        "ρ": "rho",
        "±": "+-",
        "≤": "<=",
        "≥": ">=",
        "…": "...",
    }
)
# Of the same width, where a table or a full line would shift.
_ASCII_NARROW = str.maketrans({"°": "d", "…": "~", "≤": "<", "≥": ">"})


def can_show(text: str, encoding: str | None) -> bool:
    """Whether a terminal of some encoding can show a text.

    Parameters
    ----------
    text : str
        Any text.
    encoding : str or None
        Encoding of the terminal.

    Returns
    -------
    bool
        False also where the encoding is not known.
    """
    try:
        text.encode(encoding or "ascii")
    except (UnicodeEncodeError, LookupError):
        return False
    return True


def for_encoding(text: str, encoding: str | None) -> str:
    """Text that a terminal of some encoding can show.

    Parameters
    ----------
    text : str
        Text with the field's signs.
    encoding : str or None
        Encoding of the terminal or file.

    Returns
    -------
    str
        The text as it is, or in ASCII where it cannot be shown.
    """
    if can_show(text, encoding):
        return text
    lines = "\n".join(_in_ascii(line) for line in text.split("\n"))
    return lines.encode("ascii", "replace").decode()


def _in_ascii(line: str) -> str:
    wide = line.translate(_ASCII)
    if len(wide) <= WIDTH and "  " not in line.strip():
        return wide
    return line.replace("± ", "±").translate(_ASCII_NARROW).translate(_ASCII)


def wrapped(text: str, indent: str = "  ", first: str | None = None) -> list[str]:
    """Text broken at 80 columns.

    Parameters
    ----------
    text : str
        One paragraph.
    indent : str
        Before every line but the first.
    first : str, optional
        Before the first line; else as the others.

    Returns
    -------
    list of str
        Its lines.
    """
    # A number and its unit stay together.
    kept = re.sub(r"(?<=\d) (?=(?:%|MHz|km|dB|nT|Hz|min)\b|%)", _HELD, text)
    lines = textwrap.wrap(
        kept, WIDTH, initial_indent=indent if first is None else first, subsequent_indent=indent
    )
    return [line.replace(_HELD, " ") for line in lines]


def coordinates(latitude_deg: float, longitude_deg: float) -> str:
    """A place as an operator reads it.

    Parameters
    ----------
    latitude_deg, longitude_deg : float
        Place [deg].

    Returns
    -------
    str
        Such as ``46.50 N 11.35 E``.
    """
    north = "N" if latitude_deg >= 0.0 else "S"
    east = "E" if longitude_deg >= 0.0 else "W"
    return f"{abs(latitude_deg):.2f} {north} {abs(longitude_deg):.2f} {east}"


def _end(end: End) -> str:
    place = f"{coordinates(end.latitude_deg, end.longitude_deg)} ({end.locator})"
    return f"{end.name}, {place}" if end.name else place


def _pair(label: str, cells: list[str]) -> str:
    wide = _COLUMN - 1
    fitted = [c if len(c) <= wide else c[: wide - 1] + "…" for c in cells]
    return (f"  {label:<{_LABEL - 2}}" + "".join(f"{c:<{_COLUMN}}" for c in fitted)).rstrip()


def path_text(answer: PathAnswer) -> str:
    """The answer for one path.

    Parameters
    ----------
    answer : PathAnswer
        The answer.

    Returns
    -------
    str
        The line to act on, the two waves side by side, then why.
    """
    lines = [*wrapped(answer.advice.headline, "", ""), ""]
    path = answer.path
    lines += wrapped(_end(answer.transmitter), " " * 8, "  from  ")
    lines += wrapped(_end(answer.receiver), " " * 8, "  to    ")
    way = f"{path.distance_km:.0f} km"
    if path.bearing_deg is not None and path.back_bearing_deg is not None:
        way += f", bearing {path.bearing_deg:.0f}°, back {path.back_bearing_deg:.0f}°"
    else:
        way = "straight up and down"
    lines.append(f"  {way}; {answer.frequency_mhz:.3f} MHz; {in_words(answer.time_utc)}")
    lines += ["", _pair("", [w.wave.value for w in answer.waves])]
    lines += _wave_rows(answer)
    if answer.antenna is not None:
        lines += ["", "Antenna", *_antenna(answer.antenna)]
    lines += ["", "How sure"]
    lines += _how_sure(answer)
    lines += ["", "Why"]
    lines += _why(answer)
    if answer.advice.caveats:
        lines += ["", "Keep in mind"]
        for caveat in answer.advice.caveats:
            lines += wrapped(caveat, "    ", "  - ")
    return "\n".join(lines) + "\n"


def in_words(time_utc: str) -> str:
    """An instant for reading.

    Parameters
    ----------
    time_utc : str
        ISO 8601, ending in Z.

    Returns
    -------
    str
        Such as ``2026-06-21 12:00 UTC``.
    """
    return time_utc.replace("T", " ").replace(":00Z", "Z").replace("Z", " UTC")


def _wave_rows(answer: PathAnswer) -> list[str]:
    waves = answer.waves

    def row(label: str, cell: Callable[[WaveOnPath], str | None]) -> list[str]:
        cells = [cell(w) for w in waves]
        if all(c is None for c in cells):
            return []
        return [_pair(label, [c or "-" for c in cells])]

    def words(hand: Hand | None, which: str) -> str | None:
        return None if hand is None else str(getattr(hand_in_words(hand), which))

    def fixed(value: float | None, form: str, unit: str) -> str | None:
        return None if value is None else f"{value:{form}}{unit}"

    rows: list[str] = []
    rows += row("arrives", lambda w: f"yes, as {_marked(w)}" if w.arrives else "no")
    rows += row("receive hand (IEEE)", lambda w: _name(w.receive_hand))
    rows += row("  turns, looking up", lambda w: words(w.receive_hand, "looking_up"))
    rows += row("  turns, on the map", lambda w: words(w.receive_hand, "on_the_map"))
    rows += row("  delay line in arm", lambda w: words(w.receive_hand, "delayed_arm"))
    rows += row("answer with hand", lambda w: _name(w.transmit_hand))
    rows += row("shape, axial ratio", _shape)
    rows += row("  major axis (true)", lambda w: fixed(w.major_axis_bearing_deg, ".0f", "°"))
    rows += row(
        "comes from azimuth",
        lambda w: None if w.arrival is None else f"{w.arrival.azimuth_deg:.0f}°",
    )
    rows += row(
        "  at elevation", lambda w: None if w.arrival is None else f"{w.arrival.elevation_deg:.1f}°"
    )
    rows += row("leaves with hand", lambda w: None if w.launch is None else w.launch.hand.value)
    rows += row(
        "  azimuth, elevation",
        lambda w: (
            None
            if w.launch is None
            else f"{w.launch.azimuth_deg:.0f}°, {w.launch.elevation_deg:.1f}°"
        ),
    )
    rows += row("delay", lambda w: fixed(w.group_delay_ms, ".3f", " ms"))
    rows += row("highest at", lambda w: fixed(w.apogee_km, ".0f", " km"))
    rows += row("absorption", lambda w: fixed(w.absorption_db, ".1f", " dB"))
    rows += row("level", lambda w: fixed(w.level_db, "+.1f", " dB"))
    rows += row("feeds the other wave", lambda w: fixed(w.other_wave_db, ".0f", " dB"))
    rows += row("Doppler shift", lambda w: fixed(w.doppler_hz, "+.3f", " Hz"))
    rows += row("MUF", lambda w: fixed(w.muf_mhz, ".2f", " MHz"))
    rows += row("  margin to it", lambda w: fixed(w.margin_mhz, "+.2f", " MHz"))
    rows += row("skip distance", lambda w: fixed(w.skip_km, ".0f", " km"))
    rows += row("other rays", lambda w: _others(w.rays))
    return rows


def _name(hand: Hand | None) -> str | None:
    return None if hand is None else hand.value


def _shape(wave: WaveOnPath) -> str | None:
    if wave.shape is None:
        return None
    ratio = "over 60 dB" if wave.axial_ratio_db is None else f"{wave.axial_ratio_db:.1f} dB"
    return f"{wave.shape.value}, {ratio}"


def _marked(ray: RayAnswer) -> str:
    """The label, with the wave of every hop where they differ: 2F2(xo)."""
    label, sequence = ray.label or "", ray.sequence or ""
    return label if len(set(sequence)) <= 1 else f"{label[:-3]}({sequence})"


def _others(rays: tuple[RayAnswer, ...]) -> str | None:
    cells = [f"{_marked(r)} {r.arrival.elevation_deg:.0f}°" for r in rays if r.arrival]
    if not cells:
        return None
    return cells[0] + (f" and {len(cells) - 1} more" if len(cells) > 1 else "")


_STATES = {
    "both": "both waves",
    "ordinary_only": "only the ordinary",
    "extraordinary_only": "only the extraordinary",
    "none": "neither wave",
}


def states_in_short(state: str) -> str:
    """A state in a word or two.

    Parameters
    ----------
    state : str
        "both", "ordinary_only", "extraordinary_only" or "none".

    Returns
    -------
    str
        "both", "O only", "X only" or "none".
    """
    return {"ordinary_only": "O only", "extraordinary_only": "X only"}.get(state, state)


def _how_sure(answer: PathAnswer) -> list[str]:
    advice, sky = answer.advice, answer.ionosphere
    lines: list[str] = []
    chances = advice.state_probabilities
    if chances is None or sky.fof2_error_mhz is None:
        lines += wrapped(f"Now: {_STATES[advice.state]}. The uncertainty of foF2 is not known.")
    else:
        word = "cannot tell" if advice.confidence == "cannot_tell" else advice.confidence
        parts = [
            f"{_STATES[name]} {100.0 * float(getattr(chances, name)):.0f} %"
            for name in _STATES
            if float(getattr(chances, name)) >= 0.005
        ]
        lines += wrapped(
            f"Now: {_STATES[advice.state]}; confidence: {word}. With foF2 {sky.fof2_mhz:.2f} ± "
            f"{sky.fof2_error_mhz:.2f} MHz: {', '.join(parts)}."
        )
    if advice.fading is not None:
        split = advice.fading.doppler_split_hz
        period = advice.fading.period_s
        beat = "no beat" if period is None else f"a fade every {period:.0f} s"
        lines += wrapped(f"At the stated rates the two waves are {split:+.3f} Hz apart: {beat}.")
    if advice.changes is not None:
        if not advice.changes:
            lines += wrapped("No wave comes or goes on this day.")
        for change in advice.changes:
            doubt = "" if change.plus_minus_min is None else f" ± {change.plus_minus_min:.0f} min"
            verb = "comes" if change.comes else "goes"
            lines.append(
                f"  {change.time_utc[11:16]} UTC{doubt:<10}  the {change.wave} wave {verb}: "
                f"{_STATES[change.state]}"
            )
    return lines


def _antenna(antenna: AntennaOnPath) -> list[str]:
    """What every relay position makes of the two waves."""
    name = antenna.name or "Station"
    lines = wrapped(
        f"{name}: {antenna.kind}, {antenna.height_m:.1f} m up, ground: {antenna.ground}; feed: "
        f"{antenna.feed}, SWR {antenna.network.swr:.1f}, "
        f"{round(antenna.network.loss_db, 1) + 0.0:.1f} dB lost."
    )
    wide = max(8, *(len(p.label) for p in (*antenna.positions, *antenna.arms)))
    lines.append(f"  {'relay':<{wide}}  overhead   hears O   hears X   O over X   sends into O")
    extra = [a for a in antenna.arms if all(p.single_arm != a.label for p in antenna.positions)]
    for position in (*antenna.positions, *extra):
        marks = [position.label == antenna.position, position.label == antenna.transmit_position]
        mark = ("*" if marks[0] else "") + ("+" if marks[1] else "")
        hand = position.overhead_hand.value if position.overhead_hand else "no hand"
        sends = "-" if position.ordinary_share is None else f"{100 * position.ordinary_share:.0f} %"
        label = f"({position.label})" if position in extra else position.label
        # Adding zero after rounding leaves no "-0.0".
        ordinary, extraordinary, over = (
            round(db, 1) + 0.0
            for db in (
                position.ordinary_gain_dbi,
                position.extraordinary_gain_dbi,
                position.ordinary_over_extraordinary_db,
            )
        )
        lines.append(
            f"  {label:<{wide}}  {hand:<8}{ordinary:6.1f} dBi{extraordinary:6.1f} dBi"
            f"{over:+7.1f} dB{sends:>10}  {mark}".rstrip()
        )
    lines.append("  * to receive, + to answer; (in brackets) one arm alone, not in the relay")
    gained = round(antenna.level_over_dipole_db, 1) + 0.0
    said = f"The {antenna.wave.value} wave: {gained:+.1f} dB over one dipole"
    if antenna.both_ends_db is not None:
        said += f", {round(antenna.both_ends_db, 1) + 0.0:+.1f} dB if both ends do as well"
    if antenna.fade_depth_before_db is not None and antenna.fade_depth_after_db is not None:
        said += (
            f"; fades of {_depth(antenna.fade_depth_before_db)} on one dipole become "
            f"{_depth(antenna.fade_depth_after_db)}"
        )
    lines += wrapped(f"{said}.")
    if antenna.causes:
        listed = ", ".join(
            f"{c.cause} {_rejection(c.rejection_without_db)}" for c in antenna.causes
        )
        lines += wrapped(f"Rejection would be, without each cause in turn: {listed} dB.")
    return lines


def _depth(db: float) -> str:
    return "over 40 dB" if db > 40.0 else f"{db:.1f} dB"


def _rejection(db: float) -> str:
    return "60 or more" if db >= GREATEST_REJECTION_DB else f"{round(db) + 0:d}"


def _why(answer: PathAnswer) -> list[str]:
    lines: list[str] = []
    for wave in answer.waves:
        if not wave.arrives:
            lines += wrapped(f"The {wave.wave.value} wave does not arrive: {wave.reason}.")
        elif wave.limiting and wave.receive_hand:
            place = coordinates(wave.limiting.latitude_deg, wave.limiting.longitude_deg)
            side = "along" if wave.limiting.field_angle_deg < 90.0 else "against"
            lines += wrapped(
                f"The {wave.wave.value} wave leaves the ionosphere at "
                f"{wave.limiting.height_km:.0f} km over {place}, running {side} the field "
                f"({wave.limiting.field_angle_deg:.0f}°): {wave.receive_hand.value}."
            )
    field, sky = answer.field, answer.ionosphere
    lines += wrapped(
        f"Field at the midpoint, {field.height_km:.0f} km: {field.flux_density_nt:.0f} nT, dip "
        f"{field.dip_deg:.1f}°, declination {round(field.declination_deg, 1) + 0.0:.1f}°, "
        f"gyrofrequency "
        f"{field.gyrofrequency_mhz:.3f} MHz ({field.model})."
    )
    e_region = "" if sky.foe_mhz is None else f", foE {sky.foe_mhz:.2f} MHz"
    lines += wrapped(
        f"Ionosphere there: foF2 {sky.fof2_mhz:.2f} MHz, fxF2 {sky.fxf2_mhz:.2f} MHz, hmF2 "
        f"{sky.hmf2_km:.0f} km{e_region} ({sky.source})."
    )
    return lines


def field_text(answer: FieldAnswer) -> str:
    """The geomagnetic field at a place.

    Parameters
    ----------
    answer : FieldAnswer
        The answer.

    Returns
    -------
    str
        A small table.
    """
    rows = [
        ("place", coordinates(answer.latitude_deg, answer.longitude_deg)),
        ("height", f"{answer.height_km:.0f} km"),
        ("date", answer.date),
        ("gyrofrequency", f"{answer.gyrofrequency_mhz:.3f} MHz"),
        ("dip (down positive)", f"{answer.dip_deg:.2f}°"),
        ("declination (east)", f"{answer.declination_deg:.2f}°"),
        ("total", f"{answer.flux_density_nt:.0f} nT"),
        ("east", f"{answer.east_nt:.0f} nT"),
        ("north", f"{answer.north_nt:.0f} nT"),
        ("up", f"{answer.up_nt:.0f} nT"),
        ("model", answer.model),
    ]
    return "".join(f"  {name:<22}{value}\n" for name, value in rows)


def wave_text(answer: WaveAnswer) -> str:
    """Both characteristic waves at a point of plasma.

    Parameters
    ----------
    answer : WaveAnswer
        The answer.

    Returns
    -------
    str
        The ratios and a small table.
    """

    def number(value: float | None) -> str:
        return "infinite" if value is None else f"{value:.6f}"

    def ratio(wave: OneWave) -> str:
        return "over 60 dB" if wave.axial_ratio_db is None else f"{wave.axial_ratio_db:.2f} dB"

    both = (answer.ordinary, answer.extraordinary)
    lines = [
        f"  X = {answer.X:.6f}   Y = {answer.Y:.6f}   Z = {answer.Z:.6f}   "
        f"θ = {answer.theta_deg:.2f}°",
        "",
        _pair("", ["ordinary", "extraordinary"]),
        _pair("μ", [number(w.mu) for w in both]),
        _pair("χ", [number(w.chi) for w in both]),
        _pair("ρ, real part", [number(w.rho_re) for w in both]),
        _pair("ρ, imaginary part", [number(w.rho_im) for w in both]),
        _pair("hand about the normal", [w.hand.value for w in both]),
        _pair("axial ratio", [ratio(w) for w in both]),
    ]
    return "\n".join(lines) + "\n"
