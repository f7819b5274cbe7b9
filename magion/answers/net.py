"""One net control and many partners: the hand, and the frequency, that serve most of them."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from typing import Final

import numpy as np

from magion.answers.certainty import PathMufs, state_of
from magion.answers.day import (
    IDEAL_SWITCH,
    Progress,
    chances_at,
    gyro_at_peaks,
    interpolated_mufs,
    rays_of,
)
from magion.answers.inputs import IonosphereInput, instant, require_frequency
from magion.answers.modes import ModeRay, require_length, stronger
from magion.answers.reception import RelayAt, at_antenna, choice, positions_on_path, relay_at
from magion.answers.scene import Scene, scene_of
from magion.antenna.station import Station
from magion.arrays import FloatArray
from magion.errors import InputError
from magion.geometry import Place
from magion.polarization import Hand, hand_of
from magion.rays.link import link_between
from magion.waves import MODES, Mode

SCHEMA: Final = "magion/net/1"
MOST_PARTNERS: Final = 500
MOST_FREQUENCIES: Final = 30

WITHIN_DB: Final = 6.0
"""A position serves a partner while it hears it within an S-unit of the best one [dB]."""

PARTED_DB: Final = 6.0
"""... and with one wave at least an S-unit above the other [dB]."""

_MUF_STEP_MIN = 180.0
_NEAREST = 1e3
_ALIKE = 0.05


@dataclass(frozen=True, slots=True, kw_only=True)
class NetPartner:
    """One partner.

    Parameters
    ----------
    name : str
        The operator's name for it, or its coordinates.
    latitude_deg, longitude_deg : float
        Place [deg].
    distance_km : float
        From net control [km].
    bearing_deg : float
        Toward it from net control, true [deg].
    """

    name: str
    latitude_deg: float
    longitude_deg: float
    distance_km: float
    bearing_deg: float


@dataclass(frozen=True, slots=True, kw_only=True)
class NetCell:
    """One partner on one frequency, as net control hears it.

    Parameters
    ----------
    partner : str
        Its name.
    frequency_mhz : float
        Frequency [MHz].
    state : str
        Which waves arrive.
    arrival_probability : float or None
        That any wave arrives [1].
    wave : str or None
        Wave to take.
    receive : str or None
        Relay position for it by the station's label, else the hand.
    level_db : float or None
        Of that wave to free space [dB].
    margin_mhz : float or None
        Distance of the frequency below that wave's MUF; where no wave arrives,
        below the greater of both [MHz].
    rejection_db : float or None
        Of the other wave by the station's antenna [dB].
    served_by : tuple of str
        Positions, or hands, that serve this partner.
    """

    partner: str
    frequency_mhz: float
    state: str
    arrival_probability: float | None
    wave: str | None
    receive: str | None
    level_db: float | None
    margin_mhz: float | None
    rejection_db: float | None
    served_by: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class NetFrequency:
    """The net on one frequency.

    Parameters
    ----------
    frequency_mhz : float
        Frequency [MHz].
    reached : int
        Partners of which any wave arrives [1].
    position : str or None
        The one relay position, or hand, that serves most of them.
    served, failed : tuple of str
        Partners that it serves, and that it fails.
    worst_partner : str
        The partner least likely to be heard.
    worst_probability : float or None
        Probability that any of its waves arrives [1].
    """

    frequency_mhz: float
    reached: int
    position: str | None
    served: tuple[str, ...]
    failed: tuple[str, ...]
    worst_partner: str
    worst_probability: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class NetHour:
    """The net at one instant.

    Parameters
    ----------
    time_utc : str
        Instant, ISO 8601.
    best_frequency_mhz : float or None
        Frequency that does most for the worst partner; None where no partner
        is reached on any [MHz].
    headline : str
        One line to act on.
    frequencies : tuple of NetFrequency
        Every frequency.
    cells : tuple of NetCell
        Every partner on every frequency, partner by partner.
    """

    time_utc: str
    best_frequency_mhz: float | None
    headline: str
    frequencies: tuple[NetFrequency, ...]
    cells: tuple[NetCell, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class NetAnswer:
    """The plan of a net.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    control : str
        Name or coordinates of net control.
    station : str or None
        Kind of its antenna, where a station file is given.
    source : str
        Of the ionosphere.
    partners : tuple of NetPartner
        The partners.
    hours : tuple of NetHour
        One, or every hour of a UTC day.
    caveats : tuple of str
        What to keep in mind.
    """

    schema: str
    control: str
    station: str | None
    source: str
    partners: tuple[NetPartner, ...]
    hours: tuple[NetHour, ...]
    caveats: tuple[str, ...]


def answer_net(
    control: Place,
    partners: Sequence[Place],
    frequencies_mhz: Sequence[float],
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
    *,
    whole_day: bool = False,
    station: Station | None = None,
    progress: Progress | None = None,
) -> NetAnswer:
    """One hand and one frequency for many partners.

    Parameters
    ----------
    control : Place
        Net control, receiving.
    partners : sequence of Place
        1 to 500 stations that transmit.
    frequencies_mhz : sequence of float
        1 to 30 frequencies, 0.5 to 60 [MHz].
    when : datetime, optional
        The instant; now if not given.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere.
    whole_day : bool
        Whether to answer for every hour of that UTC day [1].
    station : Station, optional
        Antenna, feed and relay of net control.
    progress : callable, optional
        Called with the share that is done, 0 to 1.

    Returns
    -------
    NetAnswer
        The plan.

    Raises
    ------
    InputError
        If an input is wrong.
    OutsideModelError
        If the date is outside the field model.
    """
    frequencies = [require_frequency(f) for f in frequencies_mhz]
    partners = _each_once(partners)
    for count, most, what in (
        (len(frequencies), MOST_FREQUENCIES, "frequencies"),
        (len(partners), MOST_PARTNERS, "partners"),
    ):
        if not 1 <= count <= most:
            raise InputError(f"{count} {what} are given; accepted: 1 to {most}")
    moment = instant(when)
    given = ionosphere or IonosphereInput()
    if whole_day and given.profile is not None:
        raise InputError(
            "a measured profile is of one instant; accepted for a day: readings, typed values, or "
            "the solar flux"
        )
    moments = [moment]
    if whole_day:
        midnight = moment.replace(hour=0, minute=0, second=0, microsecond=0)
        moments = [midnight + timedelta(hours=h) for h in range(24)]
        if given.readings is not None:
            covered = given.readings.covered
            moments = [m for m in moments if any(a <= m <= b for a, b in covered)]
            if not moments:
                raise InputError(f"the readings hold nothing on {midnight:%Y-%m-%d}")
    relays = [None if station is None else relay_at(station, f) for f in frequencies]
    tell = progress or (lambda share: None)
    rows: list[NetPartner] = []
    columns: list[list[list[NetCell]]] = []
    source, caveats = "", []
    for k, partner in enumerate(partners):
        link = link_between(partner, control)
        require_length(link)
        name = _name(partner)
        if link.distance < _NEAREST:
            raise InputError(f"partner {name} is at net control itself; accepted: another place")
        ratios = None
        if whole_day and given.readings is None:
            ratios = scene_of(link, [moment], given).overheads[0].ratios
        scene = scene_of(link, moments, given, ratios)
        source = source or scene.overheads[0].source
        caveats += [c for o in scene.overheads for c in o.caveats]
        back = link_between(control, partner)
        rows.append(
            NetPartner(
                name=name,
                latitude_deg=partner.latitude_deg,
                longitude_deg=partner.longitude_deg,
                distance_km=link.distance / 1e3,
                bearing_deg=math.degrees(back.bearing) % 360.0,
            )
        )
        columns.append(_cells(scene, name, frequencies, relays, moments, control))
        tell((k + 1) / len(partners))
    if any(r is None for r in relays) and station is not None:
        caveats.append(IDEAL_SWITCH)
    hours = []
    for h, m in enumerate(moments):
        cells = tuple(c for column in columns for c in column[h])
        hours.append(_hour(m, [f / 1e6 for f in frequencies], cells, rows))
    return NetAnswer(
        schema=SCHEMA,
        control=_name(control),
        station=None if station is None else station.antenna.kind.value,
        source=source,
        partners=tuple(rows),
        hours=tuple(hours),
        caveats=tuple(dict.fromkeys(caveats)),
    )


def _each_once(partners: Sequence[Place]) -> list[Place]:
    """Partners without repeats; those without a name are named by their coordinates."""
    found: dict[tuple[float, float], Place] = {}
    for p in partners:
        found.setdefault((p.latitude_deg, p.longitude_deg), p)
    names: set[str] = set()
    named = []
    for p in found.values():
        name = _name(p)
        if name in names and p.name is None:
            name = f"{p.latitude_deg:.5f},{p.longitude_deg:.5f}"
        if name in names:
            raise InputError(f"two partners are named {name}; accepted: each name once")
        names.add(name)
        named.append(replace(p, name=name))
    return named


def _name(place: Place) -> str:
    return place.name or f"{place.latitude_deg:.2f},{place.longitude_deg:.2f}"


def _cells(
    scene: Scene,
    name: str,
    frequencies: list[float],
    relays: list[RelayAt | None],
    moments: list[datetime],
    control: Place,
) -> list[list[NetCell]]:
    """Cells of one partner: for each hour one a frequency."""
    midnight = moments[0].replace(hour=0, minute=0, second=0, microsecond=0)
    minutes = np.array([(m - midnight).total_seconds() / 60.0 for m in moments])
    mufs = interpolated_mufs(scene, minutes, _MUF_STEP_MIN)
    gyro = gyro_at_peaks(scene, moments[0])
    found = rays_of(scene, frequencies, mufs)
    out: list[list[NetCell]] = []
    for h in range(len(moments)):
        row = []
        for f, relay, rays in zip(frequencies, relays, found, strict=True):
            chances = chances_at(scene, f, rays[h], mufs, gyro, h)
            row.append(_cell(name, f, rays[h], relay, mufs, h, chances, control))
        out.append(row)
    return out


def _cell(
    name: str,
    frequency: float,
    leading: dict[Mode, ModeRay],
    relay: RelayAt | None,
    mufs: PathMufs,
    hour: int,
    chances: FloatArray,
    control: Place,
) -> NetCell:
    heard = _heard(leading, relay, frequency, control)
    wave, receive, level, rejection = None, None, None, None
    served: tuple[str, ...] = ()
    if heard:
        best = max(h.strength_db for h in heard)
        served = tuple(
            h.label for h in heard if h.strength_db >= best - WITHIN_DB and h.parted_db >= PARTED_DB
        )
        wave, receive, rejection = _taken(leading, relay, frequency, control)
        level = leading[wave].level_db
    both = mufs.any_layer[:, hour]
    muf = both[MODES.index(wave)] if wave else (np.nan if np.isnan(both).all() else np.nanmax(both))
    margin = (float(muf) - frequency) / 1e6
    if wave is not None and margin < 0.0:
        margin = 0.0
    return NetCell(
        partner=name,
        frequency_mhz=frequency / 1e6,
        state=state_of(MODES[0] in leading, MODES[1] in leading),
        arrival_probability=None if np.isnan(chances[3]) else float(1.0 - chances[3]),
        wave=None if wave is None else wave.value,
        receive=receive,
        level_db=level,
        margin_mhz=margin if math.isfinite(margin) else None,
        rejection_db=rejection,
        served_by=served,
    )


def _taken(
    leading: dict[Mode, ModeRay], relay: RelayAt | None, frequency: float, control: Place
) -> tuple[Mode, str, float | None]:
    """The wave to take, its position or hand, and the rejection: as a path's answer has them."""
    here = None if relay is None else at_antenna(leading, control, frequency)
    if relay is None or here is None:
        mode = stronger(leading)
        return mode, hand_of(leading[mode].down.waves()[MODES.index(mode)]).value, None
    found = positions_on_path(relay, here)
    best = choice(tuple(found[p] for p in relay.station.relay), here)
    return best.wave, best.receive.label, best.receive.rejection_db(best.wave)


@dataclass(frozen=True, slots=True, kw_only=True)
class _Heard:
    """What one relay position, or hand, hears of a partner."""

    label: str
    strength_db: float
    parted_db: float


def _heard(
    leading: dict[Mode, ModeRay], relay: RelayAt | None, frequency: float, control: Place
) -> list[_Heard]:
    if not leading:
        return []
    if relay is None:
        # An ideal switch: each hand takes what arrives with it.
        found = []
        for hand in Hand:
            own = {
                m: r.level_db
                for m, r in leading.items()
                if hand_of(r.down.waves()[MODES.index(m)]) is hand
            }
            if not own:
                continue
            mode = max(own, key=lambda m: own[m])
            rest = [level for m, level in own.items() if m is not mode]
            parted = own[mode] - max(rest) if rest else math.inf
            found.append(
                _Heard(
                    label=hand.value,
                    strength_db=own[mode],
                    parted_db=parted,
                )
            )
        return found
    here = at_antenna(leading, control, frequency)
    if here is None:
        return []
    found = []
    for position in positions_on_path(relay, here).values():
        if position.label not in {p.label for p in relay.station.relay}:
            continue
        strength = {
            m: here.level_db[i] + position.gain_dbi(m)
            for i, m in enumerate(MODES)
            if here.arrives[i]
        }
        mode = max(strength, key=lambda m: strength[m])
        rest = [s for m, s in strength.items() if m is not mode]
        found.append(
            _Heard(
                label=position.label,
                strength_db=strength[mode],
                parted_db=strength[mode] - max(rest) if rest else math.inf,
            )
        )
    return found


def _hour(
    moment: datetime,
    frequencies: list[float],
    cells: tuple[NetCell, ...],
    partners: list[NetPartner],
) -> NetHour:
    rows = []
    for f in frequencies:
        own = [c for c in cells if c.frequency_mhz == f]
        labels = sorted({label for c in own for label in c.served_by})
        # Of positions that serve as many, the one that most partners would choose.
        position = max(
            labels,
            key=lambda label: (
                sum(label in c.served_by for c in own),
                sum(label == c.receive for c in own),
            ),
            default=None,
        )
        served = tuple(c.partner for c in own if position is not None and position in c.served_by)
        worst = min(own, key=_hope)
        rows.append(
            NetFrequency(
                frequency_mhz=f,
                reached=sum(c.state != "none" for c in own),
                position=position,
                served=served,
                failed=tuple(c.partner for c in own if c.partner not in served),
                worst_partner=worst.partner,
                worst_probability=worst.arrival_probability,
            )
        )
    best = max(
        rows, key=lambda r: _merit(r, [c for c in cells if c.frequency_mhz == r.frequency_mhz])
    )
    return NetHour(
        time_utc=moment.strftime("%Y-%m-%dT%H:%M:%SZ"),
        best_frequency_mhz=best.frequency_mhz if best.reached else None,
        headline=_headline(best, len(partners)),
        frequencies=tuple(rows),
        cells=cells,
    )


def _hope(cell: NetCell) -> tuple[float, float]:
    """How likely a partner is heard, then how strong."""
    chance = cell.arrival_probability
    if chance is None:
        chance = 1.0 if cell.state != "none" else 0.0
    return chance, -200.0 if cell.level_db is None else cell.level_db


def _merit(row: NetFrequency, cells: list[NetCell]) -> tuple[int, int, int, float]:
    """Partners reached; then the worst one's chance, partners served, the worst one's level."""
    chance, level = min(_hope(c) for c in cells)
    return row.reached, round(chance / _ALIKE), len(row.served), level


def _headline(best: NetFrequency, count: int) -> str:
    if best.reached == 0:
        return "No partner is reached on any of these frequencies."
    line = f"{best.frequency_mhz:.3f} MHz"
    if best.position is None:
        return f"{line}: {best.reached} of {count} are heard, but no position parts the waves."
    line += f" on {best.position}: serves {len(best.served)} of {count}"
    if best.failed:
        named = ", ".join(best.failed[:4]) + (" ..." if len(best.failed) > 4 else "")
        line += f", fails {named}"
    return line + "."
