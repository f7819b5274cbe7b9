"""From a log of readings on two relay positions: is the relay labelled right."""

import math
from dataclasses import dataclass
from datetime import datetime, timedelta
from typing import Final

import numpy as np

from magion.answers.bulk import Found, answer_path_day, jobs_of
from magion.answers.day import Progress, answer_day
from magion.answers.inputs import IonosphereInput
from magion.answers.reception import RelayAt, positions_on_path, relay_at
from magion.answers.relay_model import Expectation, evidence, expected_difference
from magion.antenna.station import Station
from magion.arrays import BoolArray, FloatArray, IntArray
from magion.errors import InputError, require_range
from magion.formats.relay_log import Reading, RelayLog
from magion.geometry import Place
from magion.polarization import Hand, hand_of
from magion.waves import MODES

SCHEMA: Final = "magion/relay/1"
PLAN_SCHEMA: Final = "magion/relay-plan/1"
NOISE_DB: Final = 3.0
STEP_MIN: Final = 15.0
"""Rows are answered for the nearest quarter of an hour [min]."""

USUAL_REJECTION_DB: Final = 20.0
"""Rejection that a row's expectation is shown for where none is known [dB]."""

_PREFERS_DB = 3.0
_TELLS_DB = 6.0
_GOOD_SHARE = 0.8


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayRow:
    """One row of the log.

    Parameters
    ----------
    line : int
        Its line in the file.
    time_utc, partner : str
        When, and who transmits.
    frequency_mhz : float
        Frequency [MHz].
    measured_db : float or None
        Level on the first position less that on the second [dB].
    expected_db : float or None
        The same as labelled, for the estimated rejection or 20 dB [dB].
    error_db : float or None
        Standard deviation of the expectation [dB].
    state : str or None
        Which waves are expected.
    use : str
        "label and rejection", "label", or why it says nothing.
    """

    line: int
    time_utc: str
    partner: str
    frequency_mhz: float
    measured_db: float | None
    expected_db: float | None
    error_db: float | None
    state: str | None
    use: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayAnswer:
    """What a log says of a relay.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    labels : tuple of str
        The two positions; differences are the first less the second.
    verdict : str
        "as labelled", "swapped" or "not enough to say".
    log10_ratio : float
        log10 of the likelihood of "as labelled" over "swapped" [1].
    rejection_db, rejection_low_db, rejection_high_db : float or None
        Rejection that the antenna reaches, and the interval that covers 90 %
        of the truths [dB].
    mean_difference_db : float or None
        Mean of the measured differences [dB].
    rows_read, rows_used, rows_with_rejection : int
        Rows of the log, rows that speak for or against the labels, rows that
        carry the rejection [1].
    headline : str
        One line to act on.
    rows : tuple of RelayRow
        Every row.
    caveats : tuple of str
        What to keep in mind.
    """

    schema: str
    labels: tuple[str, str]
    verdict: str
    log10_ratio: float
    rejection_db: float | None
    rejection_low_db: float | None
    rejection_high_db: float | None
    mean_difference_db: float | None
    rows_read: int
    rows_used: int
    rows_with_rejection: int
    headline: str
    rows: tuple[RelayRow, ...]
    caveats: tuple[str, ...]


def answer_relay(
    log: RelayLog,
    receiver: Place,
    ionosphere: IonosphereInput | None = None,
    *,
    station: Station | None = None,
    noise_db: float = NOISE_DB,
    progress: Progress | None = None,
) -> RelayAnswer:
    """Whether a relay is labelled right, and what rejection the antenna reaches.

    Parameters
    ----------
    log : RelayLog
        The readings.
    receiver : Place
        Where they were taken.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere on those days.
    station : Station, optional
        Antenna and relay; without one the positions must be named RHCP and
        LHCP.
    noise_db : float
        Scale of a reading's own error, 0.5 to 20 [dB].
    progress : callable, optional
        Called with the share that is done, 0 to 1.

    Returns
    -------
    RelayAnswer
        Verdict, rejection, and what each row gave to it.

    Raises
    ------
    InputError
        If the labels are not the station's, or an input is wrong.
    """
    given = ionosphere or IonosphereInput()
    require_range("the noise", noise_db, 0.5, 20.0, "dB")
    usable = [r for r in log.readings if r.levels_db is not None]
    expected, found, reasons = expectation_of(log, receiver, given, station, progress)
    speaks = np.array([reason is None for reason in reasons], dtype=bool)
    measured = np.array([r.levels_db[0] - r.levels_db[1] for r in usable if r.levels_db])
    result = evidence(expected.take(speaks), measured[speaks], noise_db)
    carries = expected.carries_rejection & speaks
    rejection = result.rejection_db
    middle, spread = _moments(expected, USUAL_REJECTION_DB if rejection is None else rejection)
    told = iter(range(len(usable)))
    rows = []
    for reading in log.readings:
        if reading.levels_db is None:
            rows.append(_row(reading, "a reading is missing"))
            continue
        i = next(told)
        use = reasons[i] or ("label and rejection" if carries[i] else "label")
        rows.append(
            _row(
                reading,
                use,
                measured=float(measured[i]),
                expected=float(middle[i]),
                error=float(spread[i]),
                state=found[i].state,
            )
        )
    return RelayAnswer(
        schema=SCHEMA,
        labels=log.labels,
        verdict=result.verdict,
        log10_ratio=result.log10_ratio,
        rejection_db=rejection,
        rejection_low_db=result.lowest_db,
        rejection_high_db=result.highest_db,
        mean_difference_db=float(measured.mean()) if measured.size else None,
        rows_read=len(log.readings),
        rows_used=int(speaks.sum()),
        rows_with_rejection=int(carries.sum()),
        headline=_headline(result.verdict, rejection, result.lowest_db, result.highest_db, speaks),
        rows=tuple(rows),
        caveats=_caveats(given, station, result.verdict, bool(carries.any())),
    )


def expectation_of(
    log: RelayLog,
    receiver: Place,
    ionosphere: IonosphereInput,
    station: Station | None = None,
    progress: Progress | None = None,
) -> tuple[Expectation, list[Found], list[str | None]]:
    """What is expected of the rows of a log that have both readings.

    Parameters
    ----------
    log : RelayLog
        The log.
    receiver : Place
        Where it was taken.
    ionosphere : IonosphereInput
        What is known of the ionosphere.
    station : Station, optional
        Antenna and relay.
    progress : callable, optional
        Called with the share that is done, 0 to 1.

    Returns
    -------
    rows : Expectation
        For the error model.
    found : list of Found
        The waves of each row.
    reasons : list of (str or None)
        Why a row says nothing; None where it does.

    Raises
    ------
    InputError
        If the labels are not the station's.
    """
    sides = _sides(log, station)
    usable = [r for r in log.readings if r.levels_db is not None]
    jobs, where = jobs_of(
        [(r.partner, receiver, r.time, r.frequency_mhz * 1e6) for r in usable], STEP_MIN
    )
    tell = progress or (lambda share: None)
    answers = []
    for k, job in enumerate(jobs):
        answers.append(answer_path_day(job, ionosphere))
        tell((k + 1) / len(jobs))
    found = [answers[i][j] for i, j in where]
    relays = {
        f: None if station is None else relay_at(station, f)
        for f in {r.frequency_mhz * 1e6 for r in usable}
    }
    prefers = [
        _prefers(f, relays[r.frequency_mhz * 1e6], sides, station)
        for r, f in zip(usable, found, strict=True)
    ]
    reasons = [_silent(f, p) for f, p in zip(found, prefers, strict=True)]
    return _expectation(usable, found, prefers), found, reasons


def _sides(log: RelayLog, station: Station | None) -> tuple[str, str]:
    """The two positions as hands, or as labels of the station's relay."""
    known = ["RHCP", "LHCP"] if station is None else [p.label for p in station.relay]
    found = []
    for label in log.labels:
        match = next((k for k in known if k.casefold() == label.casefold()), None)
        if match is None:
            hint = "" if station is not None else " (give --station for the labels of your relay)"
            raise InputError(
                f"position {label!r} of the log is not known; accepted: {', '.join(known)}{hint}"
            )
        found.append(match)
    if found[0] == found[1]:
        raise InputError(f"both levels are of position {found[0]!r}; accepted: two positions")
    return found[0], found[1]


def _prefers(
    found: Found, relay: RelayAt | None, sides: tuple[str, str], station: Station | None
) -> tuple[float, float]:
    """Which of the two positions prefers each wave: 1 the first, -1 the second, 0 neither."""
    if found.here is None:
        return 0.0, 0.0
    if station is None:
        hands = [hand_of(w.state).value for w in found.here.waves]
        signs = [1.0 if h == sides[0] else -1.0 for h in hands]
        return signs[0], signs[1]
    if relay is None:
        return 0.0, 0.0
    by_label = {p.label: p for p in positions_on_path(relay, found.here).values()}
    gaps = [by_label[sides[0]].gain_dbi(m) - by_label[sides[1]].gain_dbi(m) for m in MODES]
    signs = [0.0 if abs(g) < _PREFERS_DB else math.copysign(1.0, g) for g in gaps]
    return signs[0], signs[1]


def _silent(found: Found, prefers: tuple[float, float]) -> str | None:
    """Why a row says nothing; None where it does."""
    if found.state == "none":
        return "no wave expected"
    if prefers == (0.0, 0.0):
        return "heard alike"
    if found.state == "both" and prefers[0] == prefers[1]:
        return "one hand only"
    return None


def _expectation(
    readings: list[Reading], found: list[Found], prefers: list[tuple[float, float]]
) -> Expectation:
    days = [r.time.date().toordinal() for r in readings]
    chances = np.array([_chances(f) for f in found]).reshape(-1, 2)
    split = [
        0.0 if f.level_db[0] is None or f.level_db[1] is None else f.level_db[0] - f.level_db[1]
        for f in found
    ]
    sides = np.array(prefers, dtype=float).reshape(-1, 2)
    return Expectation(
        day=np.array(days, dtype=np.intp),
        ordinary_chance=chances[:, 0],
        extraordinary_chance=chances[:, 1],
        ordinary_prefers=sides[:, 0],
        extraordinary_prefers=sides[:, 1],
        split_db=np.array(split, dtype=float),
    )


def _chances(found: Found) -> tuple[float, float]:
    """Probability that each wave arrives; one for what is certain."""
    if found.probability is None:
        arrives = [level is not None for level in found.level_db]
        return float(arrives[0]), float(arrives[1])
    both, ordinary, extraordinary, _ = found.probability
    return min(both + ordinary, 1.0), min(both + extraordinary, 1.0)


def _moments(rows: Expectation, rejection_db: float) -> tuple[FloatArray, FloatArray]:
    """Mean and standard deviation of the expected difference over the states."""
    both = np.minimum(rows.ordinary_chance, rows.extraordinary_chance)
    states = [
        (1.0, 1.0, both),
        (1.0, 0.0, rows.ordinary_chance - both),
        (0.0, 1.0, rows.extraordinary_chance - both),
        (0.0, 0.0, 1.0 - np.maximum(rows.ordinary_chance, rows.extraordinary_chance)),
    ]
    values, weights = [], []
    for o, x, chance in states:
        values.append(
            expected_difference(
                np.full(both.shape, o), np.full(both.shape, x), rows.ordinary_prefers,
                rows.extraordinary_prefers, rows.split_db, np.asarray(rejection_db),
            )
        )  # fmt: skip
        weights.append(chance)
    mean = sum(v * w for v, w in zip(values, weights, strict=True))
    square = sum(v * v * w for v, w in zip(values, weights, strict=True))
    return np.asarray(mean), np.sqrt(np.maximum(np.asarray(square - mean * mean), 0.0))


def _row(
    reading: Reading,
    use: str,
    *,
    measured: float | None = None,
    expected: float | None = None,
    error: float | None = None,
    state: str | None = None,
) -> RelayRow:
    place = reading.partner
    return RelayRow(
        line=reading.line,
        time_utc=reading.time.strftime("%Y-%m-%dT%H:%M:%SZ"),
        partner=place.name or f"{place.latitude_deg:.2f},{place.longitude_deg:.2f}",
        frequency_mhz=reading.frequency_mhz,
        measured_db=measured,
        expected_db=expected,
        error_db=error,
        state=state,
        use=use,
    )


def _headline(
    verdict: str,
    rejection: float | None,
    low: float | None,
    high: float | None,
    speaks: BoolArray,
) -> str:
    if verdict == "not enough to say":
        if not speaks.any():
            return "Not enough to say: no row of the log speaks for or against the labels."
        return (
            f"Not enough to say: the {int(speaks.sum())} rows that speak do not tell the labels "
            "from swapped ones."
        )
    told = "The relay is labelled right" if verdict == "as labelled" else "Your relay is reversed"
    if rejection is None or low is None or high is None:
        return f"{told}; no row tells the rejection that the antenna reaches."
    return f"{told}; the antenna rejects by {rejection:.0f} dB ({low:.0f} to {high:.0f})."


def _caveats(
    given: IonosphereInput, station: Station | None, verdict: str, carries: bool
) -> tuple[str, ...]:
    caveats = []
    if given.readings is None:
        caveats.append(
            "foF2 comes from the climatology: readings of an ionosonde on those days "
            "(--readings) make every row say more."
        )
    if station is None:
        caveats.append("Without a station file the positions are taken as ideal RHCP and LHCP.")
    if not carries and verdict != "not enough to say":
        caveats.append(
            "Rows of both waves together measure their level split, not the antenna: read at dawn "
            "or dusk, when one wave is left."
        )
    return tuple(caveats)


@dataclass(frozen=True, slots=True, kw_only=True)
class TellingWindow:
    """Hours at which a test of the relay tells most.

    Parameters
    ----------
    start_utc, end_utc : str
        The window, ISO 8601.
    frequency_mhz : float
        Frequency [MHz].
    wave : str
        Wave that is expected alone or far stronger.
    hand : str
        The hand it arrives with.
    louder : str
        Relay position, or hand, that should be the louder.
    chance : float
        That it is so, by the uncertainty of foF2 [1].
    expect : str
        What to expect, in words.
    """

    start_utc: str
    end_utc: str
    frequency_mhz: float
    wave: str
    hand: str
    louder: str
    chance: float
    expect: str


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayPlan:
    """When to test a relay.

    Parameters
    ----------
    schema : str
        Name and number of the JSON contract.
    transmitter, receiver : str
        The ends in words.
    date : str
        The UTC day.
    windows : tuple of TellingWindow
        The best first.
    headline : str
        One line to act on.
    caveats : tuple of str
        What to keep in mind.
    """

    schema: str
    transmitter: str
    receiver: str
    date: str
    windows: tuple[TellingWindow, ...]
    headline: str
    caveats: tuple[str, ...]


def answer_relay_plan(
    transmitter: Place,
    receiver: Place,
    frequencies_mhz: tuple[float, ...],
    when: datetime | None = None,
    ionosphere: IonosphereInput | None = None,
    *,
    station: Station | None = None,
    progress: Progress | None = None,
) -> RelayPlan:
    """Hours of a UTC day at which a test of the relay tells most.

    Parameters
    ----------
    transmitter, receiver : Place
        The ends; the receiver is the user.
    frequencies_mhz : tuple of float
        Frequencies to choose from [MHz].
    when : datetime, optional
        An instant of the day; now if not given.
    ionosphere : IonosphereInput, optional
        What is known of the ionosphere.
    station : Station, optional
        Antenna and relay.
    progress : callable, optional
        Called with the share that is done, 0 to 1.

    Returns
    -------
    RelayPlan
        Windows in which one wave is expected alone, or far stronger.

    Raises
    ------
    InputError
        If an input is wrong.
    """
    day = answer_day(
        transmitter,
        receiver,
        frequencies_mhz,
        when,
        ionosphere,
        station=station,
        progress=progress,
    )
    windows: list[TellingWindow] = []
    step = timedelta(hours=float(day.hours[1] - day.hours[0]))
    silent = []
    for f in day.frequencies:
        labels = _labels_by_hand(station, f.frequency_mhz)
        if labels is None:
            silent.append(f"{f.frequency_mhz:g}")
            continue
        chance, wave = _telling(f.probability, f.level_db)
        for i, last in _runs(chance >= _GOOD_SHARE, wave):
            k = i + int(np.argmax(chance[i : last + 1]))
            own = int(wave[k])
            hand = f.receive_hand[own][k]
            if hand is None:
                continue
            best = f.receive[k] if f.wave[k] == MODES[own].value else None
            louder = best if best in labels.values() else labels.get(hand)
            split = f.level_db[own, k] - f.level_db[1 - own, k]
            expect = (
                f"only the {MODES[own].value} wave: the difference is the antenna's rejection"
                if math.isnan(split)
                else f"the {MODES[own].value} wave {split:.0f} dB above the other"
            )
            end = datetime.fromisoformat(day.time_utc[last]) + step
            windows.append(
                TellingWindow(
                    start_utc=day.time_utc[i],
                    end_utc=end.strftime("%Y-%m-%dT%H:%M:%SZ"),
                    frequency_mhz=f.frequency_mhz,
                    wave=MODES[own].value,
                    hand=Hand(hand).value,
                    louder=louder or hand,
                    chance=float(chance[k]),
                    expect=expect,
                )
            )
    windows.sort(key=lambda w: -w.chance)
    headline = "No hour of this day is telling: both waves come, or none. Try a lower frequency."
    if windows:
        first = windows[0]
        headline = (
            f"Test on {first.frequency_mhz:.3f} MHz from {first.start_utc[11:16]} to "
            f"{first.end_utc[11:16]} UTC: {first.louder} should be the louder."
        )
    return RelayPlan(
        schema=PLAN_SCHEMA,
        transmitter=day.transmitter,
        receiver=day.receiver,
        date=day.date,
        windows=tuple(windows),
        headline=headline,
        caveats=(
            *day.caveats,
            *(
                ["No relay position has a hand on " + ", ".join(silent) + " MHz: nothing to test."]
                if silent
                else []
            ),
        ),
    )


def _labels_by_hand(station: Station | None, frequency_mhz: float) -> dict[str, str] | None:
    """Relay position of each hand overhead; None where the station has no hand there."""
    if station is None:
        return {hand.value: hand.value for hand in Hand}
    relay = relay_at(station, frequency_mhz * 1e6)
    if relay is None:
        return None
    found = {h.value: p.label for p, h in relay.hands.items() if h is not None}
    return found or None


def _telling(probability: FloatArray, level_db: FloatArray) -> tuple[FloatArray, IntArray]:
    """Chance that one wave is alone or far stronger, and which, step by step."""
    both, ordinary, extraordinary = (np.nan_to_num(probability[i]) for i in range(3))
    split = np.nan_to_num(level_db[0] - level_db[1])
    # How sure it is that the split, wrong by 6 dB, leaves one wave 6 dB above the other.
    o_far = np.clip(0.5 + (split - _TELLS_DB) / 24.0, 0.0, 1.0) * (split > _TELLS_DB)
    x_far = np.clip(0.5 + (-split - _TELLS_DB) / 24.0, 0.0, 1.0) * (-split > _TELLS_DB)
    each = np.stack([ordinary + both * o_far, extraordinary + both * x_far])
    return np.asarray(each.max(axis=0)), np.asarray(each.argmax(axis=0))


def _runs(good: BoolArray, wave: IntArray) -> list[tuple[int, int]]:
    """First and last step of every run of one wave."""
    runs: list[tuple[int, int]] = []
    for i in np.flatnonzero(good):
        if runs and runs[-1][1] == i - 1 and wave[i] == wave[i - 1]:
            runs[-1] = (runs[-1][0], int(i))
        else:
            runs.append((int(i), int(i)))
    return runs
