"""The ionosphere and field of one path at one or several hours."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import datetime

import numpy as np

from magion.answers.inputs import IonosphereInput, solar_flux
from magion.arrays import FloatArray
from magion.constants import EARTH_RADIUS
from magion.field import FieldFit, fit_field, flux_density, gyrofrequency
from magion.geometry import great_circle
from magion.ionosphere.along import Stations, path_ionosphere, stations_along
from magion.ionosphere.layers import LayerParameters, frequency_of_density
from magion.ionosphere.medium import Medium
from magion.ionosphere.profile import VerticalProfiles, profiles_of_layers
from magion.rays.link import Link

_DAY_SPREAD, _NIGHT_SPREAD = 0.12, 0.18


@dataclass(frozen=True, slots=True, kw_only=True)
class Overhead:
    """The ionosphere over the midpoint at one hour.

    Parameters
    ----------
    profiles : VerticalProfiles
        Its vertical profile.
    layers : LayerParameters or None
        Its layers; None for a measured profile.
    fof2, hmf2 : float
        Critical frequency [Hz] and peak height [m].
    foe : float or None
        Critical frequency of E, where it has a peak of its own [Hz].
    fof2_error : float or None
        Standard deviation of foF2 [Hz].
    error_source : str or None
        Where that comes from.
    source : str
        Where the ionosphere comes from.
    caveats : tuple of str
        What the user should know about it.
    ratios : tuple of float
        foF2, height of F2 above 100 km, and foE over the climatology's [1].
    """

    profiles: VerticalProfiles
    layers: LayerParameters | None
    fof2: float
    hmf2: float
    foe: float | None
    fof2_error: float | None
    error_source: str | None
    source: str
    caveats: tuple[str, ...]
    ratios: tuple[float, float, float] = (1.0, 1.0, 1.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Scene:
    """Everything the waves of one path are made from.

    Parameters
    ----------
    link : Link
        The path.
    medium : Medium
        The ionospheres, one an hour.
    field : FieldFit
        The geomagnetic field.
    gyro_limit : float
        Greatest gyrofrequency at 100 km along the path [Hz].
    overheads : tuple of Overhead
        The ionosphere over the midpoint, one an hour.
    places : tuple of LayerParameters
        Parameters at the stations, one an hour; empty for a measured profile.
    stations : Stations or None
        The stations; None for a measured profile.
    """

    link: Link
    medium: Medium
    field: FieldFit
    gyro_limit: float
    overheads: tuple[Overhead, ...]
    places: tuple[LayerParameters, ...]
    stations: Stations | None


def scene_of(
    link: Link,
    moments: Sequence[datetime],
    given: IonosphereInput,
    ratios: tuple[float, float, float] | None = None,
) -> Scene:
    """Ionosphere and field of a path at some instants of one UTC day.

    Parameters
    ----------
    link : Link
        The path.
    moments : sequence of datetime
        The instants, UTC.
    given : IonosphereInput
        What the user knows of the ionosphere.
    ratios : tuple of float, optional
        Scale the climatology by these (see :class:`Overhead`) in place of the
        typed values [1].

    Returns
    -------
    Scene
        From the measured profile, or from the climatology along the path,
        scaled to the readings and typed values where they were taken.

    Raises
    ------
    InputError
        If the readings do not cover an instant.
    """
    ends = (
        link.transmitter.latitude,
        link.transmitter.longitude,
        link.receiver.latitude,
        link.receiver.longitude,
    )
    # Of the day's start: the field is one for all hours, whichever are asked for.
    field = fit_field(*ends, moments[0].replace(hour=0, minute=0, second=0, microsecond=0))
    limit = _greatest_gyrofrequency(link, field)
    if given.profile is not None:
        one = _measured(given, given.profile)
        return Scene(
            link=link,
            medium=given.profile,
            field=field,
            gyro_limit=limit,
            overheads=(one,) * len(moments),
            places=(),
            stations=None,
        )
    from magion.ionosphere.climatology import climate

    stations = stations_along(*ends)
    count = stations.latitude.size
    mid_latitude, mid_longitude = link.point(0.5)
    # After the stations: the midpoint, and where readings were taken.
    extra = [(mid_latitude, mid_longitude)]
    place = given.readings.place if given.readings is not None else None
    if place is not None:
        extra.append((place.latitude, place.longitude))
    flux, assumed = solar_flux(given)
    hours = np.array([m.hour + m.minute / 60.0 + m.second / 3600.0 for m in moments])
    found = climate(
        np.concatenate([stations.latitude, [p[0] for p in extra]]),
        np.concatenate([stations.longitude, [p[1] for p in extra]]),
        moments[0],
        hours,
        flux,
    )
    overheads, places = [], []
    for i, moment in enumerate(moments):
        everywhere = found.places(i)
        where = count + len(extra) - 1
        base = everywhere.at(where)
        source = base.source + (" (assumed)" if assumed else "")
        known = _known(given, moment)
        asked = ratios or (
            1.0 if known.fof2 is None else known.fof2 / float(base.fof2),
            1.0 if known.hmf2 is None else (known.hmf2 - 100e3) / (float(base.hmf2) - 100e3),
            1.0 if known.foe is None else known.foe / float(base.foe),
        )
        scaled = everywhere.scaled(fof2=asked[0], hmf2=asked[1], foe=asked[2])
        if given.foes_mhz is not None:
            scaled = replace(scaled, foes=given.foes_mhz * 1e6)
        middle = scaled.at(count)
        caveats = [] if assumed is None else [assumed]
        if assumed is not None and known.fof2 is not None:
            caveats = ["A solar flux of 120 sfu is assumed for what was not given."]
        caveats += known.caveats
        if place is not None:
            away = float(great_circle(place.latitude, place.longitude, *extra[0])[0])
            if away * EARTH_RADIUS > 500e3:
                caveats.append(
                    f"The readings were taken {away * EARTH_RADIUS / 1e3:.0f} km from the "
                    "midpoint: "
                    "their ratio to the climatology may not hold here."
                )
        if float(middle.foe) > float(middle.fof2):
            caveats.append("foE is above foF2: the E region hides the F region from below.")
        spread = _NIGHT_SPREAD if found.zenith[i, count] > np.pi / 2.0 else _DAY_SPREAD
        overheads.append(
            Overhead(
                profiles=profiles_of_layers([middle]),
                layers=middle,
                fof2=float(middle.fof2),
                hmf2=float(middle.hmf2),
                foe=float(middle.foe),
                fof2_error=known.error if known.error is not None else spread * float(middle.fof2),
                error_source=known.error_source or f"usual day-to-day spread, {100 * spread:.0f} %",
                source=f"{known.source}; the rest: {source}" if known.source else source,
                caveats=tuple(caveats),
                ratios=asked,
            )
        )
        places.append(_first(scaled, count))
    return Scene(
        link=link,
        medium=path_ionosphere(stations, places),
        field=field,
        gyro_limit=limit,
        overheads=tuple(overheads),
        places=tuple(places),
        stations=stations,
    )


def with_changed_layers(scene: Scene) -> tuple[Scene, FloatArray]:
    """The first hour of a scene with two small changes beside it.

    Parameters
    ----------
    scene : Scene
        A scene with layers.

    Returns
    -------
    Scene
        Its medium holds the unchanged ionosphere, one with foF2 a thousandth
        higher, and one with hmF2 raised by a thousandth of its height above
        100 km.
    steps : ndarray, shape (2,)
        Size of both changes over the midpoint [Hz, m].
    """
    if scene.stations is None:
        return scene, np.ones(2)
    share = 1e-3
    layers = scene.places[0]
    several = (layers, layers.scaled(fof2=1.0 + share), layers.scaled(hmf2=1.0 + share))
    overhead = scene.overheads[0]
    steps = np.array([overhead.fof2 * share, (overhead.hmf2 - 100e3) * share])
    return replace(scene, medium=path_ionosphere(scene.stations, several)), steps


@dataclass(frozen=True, slots=True, kw_only=True)
class _Known:
    """Values that replace the climatology's at one instant."""

    fof2: float | None = None
    hmf2: float | None = None
    foe: float | None = None
    error: float | None = None
    error_source: str | None = None
    source: str | None = None
    caveats: tuple[str, ...] = ()


def _known(given: IonosphereInput, moment: datetime) -> _Known:
    if given.readings is not None:
        reading = given.readings.at(moment)
        error = None if given.fof2_error_mhz is None else given.fof2_error_mhz * 1e6
        caveats = list(reading.caveats)
        if given.readings.place is None:
            caveats.append("The readings name no place: they are taken as of the path's midpoint.")
        names = ["foF2"] + [n for n, v in (("hmF2", reading.hmf2), ("foE", reading.foe)) if v]
        return _Known(
            fof2=reading.fof2,
            hmf2=reading.hmf2,
            foe=reading.foe,
            error=error if error is not None else reading.fof2_error,
            error_source="typed"
            if error is not None
            else ("readings" if reading.fof2_error is not None else None),
            source=f"{', '.join(names)} from readings {given.readings_name or ''}".strip(),
            caveats=tuple(caveats),
        )
    typed = {"foF2": given.fof2_mhz, "hmF2": given.hmf2_km, "foE": given.foe_mhz}
    names = [name for name, value in typed.items() if value is not None]
    error = None if given.fof2_error_mhz is None else given.fof2_error_mhz * 1e6
    return _Known(
        fof2=None if given.fof2_mhz is None else given.fof2_mhz * 1e6,
        hmf2=None if given.hmf2_km is None else given.hmf2_km * 1e3,
        foe=None if given.foe_mhz is None else given.foe_mhz * 1e6,
        error=error,
        error_source=None if error is None else "typed",
        source=f"{', '.join(names)} as typed" if names else None,
    )


def _first(layers: LayerParameters, count: int) -> LayerParameters:
    """Parameters of the first places only."""
    values = {
        name: getattr(layers, name)[:count]
        for name in LayerParameters.__dataclass_fields__
        if isinstance(getattr(layers, name), np.ndarray)
    }
    return replace(layers, **values)


def _measured(given: IonosphereInput, profile: VerticalProfiles) -> Overhead:
    density, height = profile.peak()
    e_peak = profile.e_peak()
    own = e_peak is not None and e_peak[1] < height
    error = given.fof2_error_mhz
    return Overhead(
        profiles=profile,
        layers=None,
        fof2=float(frequency_of_density(density)),
        hmf2=height,
        foe=float(frequency_of_density(e_peak[0])) if e_peak is not None and own else None,
        fof2_error=None if error is None else error * 1e6,
        error_source=None if error is None else "typed",
        source=f"measured profile {given.profile_name or ''}".strip(),
        caveats=("The measured profile is taken as the same along the whole path.",),
    )


def _greatest_gyrofrequency(link: Link, field: FieldFit) -> float:
    """Greatest gyrofrequency at 100 km along the path [Hz]."""
    share = np.linspace(0.0, 1.0, 21) * link.angle
    along: FloatArray = link.up[:, None] * np.cos(share) + link.forward[:, None] * np.sin(share)
    flux, _ = field.at(along * (EARTH_RADIUS + 100e3))
    return float(gyrofrequency(flux_density(flux)).max())
