"""The usual cautions of the work with wires, masts and radio power."""

from typing import Final

CAUTIONS: Final = (
    "Never over, under or near power lines, in any fall of mast, wire or throw line.",
    "Keep wire ends above reach (about 3 m over a walkway); flag wires and guys.",
    "At first thunder stop; disconnect and ground the feeders when idle. A relay is no "
    "disconnect. Give each dipole a bleed path for static.",
    "DC for the relay: know which cables carry it, fuse it, block it from receivers and analysers.",
    "Never switch the relay with transmit power on; interlock it with the keying. Label the box "
    "if its parts are for receiving only.",
    "Low wires put people in the near field, and wire ends carry high voltage: evaluate RF "
    "exposure by your local rule.",
    "Transmit only where you are licensed. This is physics, not permission: local codes and "
    "licensed practice come first.",
    "Where life depends on it, a prediction is an estimate: agree on a fallback frequency and "
    "relay position.",
)
"""Common practice, printed with every build sheet."""
