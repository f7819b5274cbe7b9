"""What a station is made of: antenna, ground, feed, and the relay's own labels."""

import math
from dataclasses import dataclass, field
from enum import Enum

from magion.geometry import Place
from magion.ground import Ground


class AntennaKind(Enum):
    """Kinds of antenna."""

    CROSSED_DIPOLES = "crossed-dipoles"
    CROSSED_VEES = "crossed-inverted-vees"
    CROSSED_LOOPS = "crossed-loops"
    DIPOLE = "dipole"
    VEE = "inverted-vee"

    @property
    def is_crossed(self) -> bool:
        """Whether it has two arms."""
        return self not in (AntennaKind.DIPOLE, AntennaKind.VEE)

    @property
    def is_loops(self) -> bool:
        """Whether its elements are small loops, for receiving."""
        return self is AntennaKind.CROSSED_LOOPS

    @property
    def is_vee(self) -> bool:
        """Whether its legs slope."""
        return self in (AntennaKind.CROSSED_VEES, AntennaKind.VEE)


class FeedKind(Enum):
    """Kinds of feed network."""

    TEE = "tee"
    COMBINER = "combiner"
    HYBRID = "hybrid"
    DIGITAL = "digital"


@dataclass(frozen=True, slots=True, kw_only=True)
class MeasuredImpedance:
    """Feed-point impedance of each element, as the operator measured it.

    Parameters
    ----------
    frequency : float
        Frequency of the measurement [Hz].
    resistance, reactance : float
        Series impedance there [ohm].
    quality_factor : float
        Q of the series resonance that gives the reactance its slope [1].
    """

    frequency: float
    resistance: float
    reactance: float
    quality_factor: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Arm:
    """One element.

    Parameters
    ----------
    name : str
        The operator's name for it.
    bearing : float
        Of the hot leg, east of true north; of a vertical loop, the bearing of
        its plane on the side that counts as hot [rad].
    """

    name: str
    bearing: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Antenna:
    """The elements and where they hang.

    Parameters
    ----------
    kind : AntennaKind
        What they are.
    height : float
        Of the feed point above the ground; of a loop, of its centre [m].
    arms : tuple of Arm
        One element, or two that cross at right angles.
    resonant_frequency : float or None
        Frequency at which the elements are resonant [Hz].
    leg_length : float or None
        Of each leg; None for loops and where the resonant frequency is given [m].
    wire_diameter : float
        Of the wire [m].
    apex_angle : float
        Between the legs, pi where they are level [rad].
    measured : MeasuredImpedance or None
        The impedance, where it was measured.
    """

    kind: AntennaKind
    height: float
    arms: tuple[Arm, ...]
    resonant_frequency: float | None = None
    leg_length: float | None = None
    wire_diameter: float = 2e-3
    apex_angle: float = math.pi
    measured: MeasuredImpedance | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Feed:
    """The network between the elements and the radio.

    Parameters
    ----------
    kind : FeedKind
        Tee, isolated combiner, 90-degree hybrid, or two receivers combined
        digitally.
    velocity_factor : float
        Of all cables [1].
    impedance : float
        Characteristic impedance of all cables [ohm].
    radio_impedance : float
        Of the receiver and transmitter, and of the ports of a combiner or
        hybrid [ohm].
    line_length : float or None
        Of the delay line; None is a quarter wave at the resonant frequency,
        leads counted in [m].
    leads : float
        Relay leads and connectors in the delayed path, as cable [m].
    feeder_length : float
        Of the equal feeders between the elements and the relay box [m].
    loss_db_per_100m : float
        Of the cables at 10 MHz; it grows with the root of the frequency [dB].
    phase_error : float
        Of a hybrid or of the digital combination, beyond 90 degrees [rad].
    amplitude_error_db : float
        Of the same, of the delayed arm over the other [dB].
    receive_only : bool
        Whether transmit power must stay out of it.
    """

    kind: FeedKind
    velocity_factor: float = 0.66
    impedance: float = 50.0
    radio_impedance: float = 50.0
    line_length: float | None = None
    leads: float = 0.0
    feeder_length: float = 0.0
    loss_db_per_100m: float = 0.0
    phase_error: float = 0.0
    amplitude_error_db: float = 0.0
    receive_only: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class RelayPosition:
    """One position of the relay.

    Parameters
    ----------
    label : str
        The operator's own label.
    delayed : str or None
        Arm that the delay line lies in, both arms being joined.
    single : str or None
        The one arm that is used, where only one is.
    """

    label: str
    delayed: str | None = None
    single: str | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Station:
    """A station.

    Parameters
    ----------
    name : str or None
        The operator's name for it.
    place : Place
        Where it is.
    antenna : Antenna
        Its antenna.
    ground : Ground
        Its ground.
    ground_name : str
        Class of the ground, or its constants in words.
    feed : Feed
        Its feed network.
    relay : tuple of RelayPosition
        Its relay positions, at least one.
    """

    name: str | None
    place: Place
    antenna: Antenna
    ground: Ground
    ground_name: str
    feed: Feed
    relay: tuple[RelayPosition, ...] = field(default=())

    @property
    def can_transmit(self) -> bool:
        """Whether the antenna and its feed may carry transmit power."""
        receiving = self.feed.receive_only or self.feed.kind is FeedKind.DIGITAL
        return not (receiving or self.antenna.kind.is_loops)
