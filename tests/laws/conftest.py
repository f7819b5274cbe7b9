"""Days, nets and paths that several files ask for; their rays are traced once a session.

Of a day or a net the station, and the doubt about foF2, come after the rays: answers that differ in
nothing else share them.
"""

from dataclasses import replace
from datetime import UTC, datetime, timedelta

import numpy as np
import pytest

import magion.answers.day as day_module
import magion.answers.net as net_module
import magion.answers.path as path_module
from magion.answers.certainty import PathMufs
from magion.answers.day import answer_day
from magion.answers.inputs import IonosphereInput
from magion.answers.net import answer_net
from magion.answers.path import answer_path
from magion.geometry import parse_place

FLUX = IonosphereInput(flux=130.0)
DECEMBER, JUNE = datetime(2026, 12, 21, tzinfo=UTC), datetime(2026, 6, 21, tzinfo=UTC)


class _Traced:
    """Scenes, MUFs and rays by what they hang on."""

    def __init__(self):
        names = "scene_of", "interpolated_mufs", "rays_of"
        self._real = {n: getattr(day_module, n) for n in names}
        self._kept, self._asked = {}, {}

    def _once(self, name, key, *arguments, **named):
        if (name, key) not in self._kept:
            self._kept[name, key] = self._real[name](*arguments, **named)
        return self._kept[name, key]

    def scene_of(self, link, moments, given, ratios=None):
        ends = link.transmitter, link.receiver
        known = replace(given, readings=None), id(given.readings)
        scene = self._once(
            "scene_of", (*ends, tuple(moments), *known, ratios), link, moments, given, ratios
        )
        rest = replace(known[0], fof2_error_mhz=None)
        self._asked[id(scene)] = (*ends, tuple(moments), rest, known[1], ratios)
        return scene

    def interpolated_mufs(self, scene, minutes, *more):
        key = self._asked[id(scene)], tuple(minutes), more
        return self._once("interpolated_mufs", key, scene, minutes, *more)

    def rays_of(self, scene, frequencies, mufs, **more):
        key = self._asked[id(scene)], tuple(frequencies), id(mufs), tuple(more.items())
        return self._once("rays_of", key, scene, frequencies, mufs, **more)

    def __call__(self, module, answer, *arguments, **named):
        with pytest.MonkeyPatch.context() as patch:
            for name in self._real:
                patch.setattr(module, name, getattr(self, name))
            return answer(*arguments, **named)


@pytest.fixture(scope="session")
def traced():
    return _Traced()


def _places(text):
    return tuple(parse_place(p, name=n) for n, p in (t.split("=") for t in text.split()))


@pytest.fixture(scope="session")
def day_of(traced):
    """A day by its ends, frequencies and date."""

    def ask(ends, frequencies, when, given=FLUX, **options):
        start, end = (parse_place(p) for p in ends)
        return traced(day_module, answer_day, start, end, frequencies, when, given, **options)

    return ask


@pytest.fixture(scope="session")
def net_of(traced):
    """A net by net control, named partners, frequencies and instant."""

    def ask(control, partners, frequencies, when, given=FLUX, **options):
        ends = (parse_place(control), _places(partners))
        return traced(net_module, answer_net, *ends, frequencies, when, given, **options)

    return ask


@pytest.fixture(scope="session")
def path_of():
    """A path at an instant; its rays and MUFs are traced once, whatever the station."""
    kept = {}

    def once(function, key_of):
        def answer(*arguments, **named):
            key = function.__name__, key_of(*arguments), tuple(sorted(named.items()))
            if key not in kept:
                kept[key] = function(*arguments, **named), arguments
            return kept[key][0]

        return answer

    keys = {
        "scene_of": lambda link, moments, given: (link.transmitter, link.receiver, *moments, given),
        "find_modes": lambda scene, *rest: (id(scene), *rest),
        "path_mufs": lambda scene, hops: (id(scene), tuple(hops)),
    }

    def ask(ends, mhz, when, given=FLUX, **options):
        start, end = (parse_place(p) for p in ends)
        with pytest.MonkeyPatch.context() as patch:
            for name, key_of in keys.items():
                patch.setattr(path_module, name, once(getattr(path_module, name), key_of))
            return answer_path(start, end, mhz, when, given, **options)

    return ask


@pytest.fixture(scope="session")
def hands_of():
    """A path at an instant without its MUFs, where only its rays are looked at."""

    def nothing(scene, hops, **options):
        return PathMufs(any_layer=np.full((2, 1), np.nan), f_region=np.full((2, 1), np.nan))

    def ask(start, end, mhz, when, given=FLUX, **options):
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(path_module, "path_mufs", nothing)
            return answer_path(start, end, mhz, when, given, **options)

    return ask


@pytest.fixture(scope="session")
def at_step():
    """The instant of a step of a day."""
    return lambda answer, i: (
        datetime.fromisoformat(answer.date).replace(tzinfo=UTC)
        + timedelta(hours=float(answer.hours[i]))
    )
