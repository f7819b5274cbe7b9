"""magion: ionospheric magneto-ionic modes, and the hand to switch to."""

__version__ = "0.1.0"
