"""Values scaled from an ionogram, with the letters that qualify and describe them.

A value stands as its number, a qualifying letter and a descriptive letter:
``7.2UF`` is uncertain because of spread echoes. The letters and their meaning
are those of the handbook [URSI1972]_, in short words.
"""

import math
import re
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

QUALIFYING: Final = MappingProxyType(
    {
        "A": "at most this value, by the blanketing",
        "D": "greater than this value",
        "E": "less than this value",
        "I": "interpolated in place of a missing value",
        "J": "deduced from the extraordinary wave",
        "M": "ordinary and extraordinary wave not told apart",
        "O": "deduced from the ordinary wave",
        "T": "set by the sequence of readings around it",
        "U": "uncertain",
        "Z": "deduced from the third (z) trace",
    }
)
"""Meaning of the first letter."""

DESCRIPTIVE: Final = MappingProxyType(
    {
        "A": "a lower thin layer such as sporadic E",
        "B": "absorption near the lowest frequency seen",
        "C": "equipment or another cause outside the ionosphere",
        "D": "the upper end of the frequency range",
        "E": "the lower end of the frequency range",
        "F": "spread echoes",
        "G": "too little ionization in the layer",
        "H": "stratification",
        "K": "particle E layer",
        "L": "no definite cusp between layers",
        "M": "ordinary and extraordinary wave not told apart",
        "N": "no interpretation possible",
        "O": "of the ordinary wave",
        "P": "man-made perturbation, or spur-type spread F",
        "Q": "range spread",
        "R": "attenuation near the critical frequency",
        "S": "interference or atmospherics",
        "T": "set by the sequence of readings around it",
        "V": "forked trace",
        "W": "echo outside the height range",
        "X": "of the extraordinary wave",
        "Y": "lacuna or strong tilt of the layer",
        "Z": "third (z) trace present",
    }
)
"""Meaning of the second letter."""

ALONE_QUALIFYING: Final = "DEIJU"
"""Letters that qualify when they stand alone behind a number; any other describes."""

_NO_LETTER = "-/"
_VALUE = re.compile(r"([+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+))?\s*([A-Za-z/-]{0,2})")
_WHOLE = re.compile(r"([+-]?[0-9]+)?\s*([A-Za-z/-]{0,2})")


@dataclass(frozen=True, slots=True, kw_only=True)
class ScaledValue:
    """A value as an ionogram's reader writes it.

    Parameters
    ----------
    value : float
        The number as it stands; NaN where letters alone tell that there is none.
    qualifying : str
        Qualifying letter, or empty.
    descriptive : str
        Descriptive letter, or empty.
    """

    value: float
    qualifying: str = ""
    descriptive: str = ""

    @property
    def letters(self) -> str:
        """The letters, ``-`` for an absent qualifying one; empty without letters [text]."""
        if self.descriptive and not math.isnan(self.value):
            return (self.qualifying or "-") + self.descriptive
        return self.qualifying + self.descriptive

    @property
    def meaning(self) -> str:
        """What the letters mean; empty without letters [text]."""
        words = (QUALIFYING.get(self.qualifying), DESCRIPTIVE.get(self.descriptive))
        return ", ".join(w for w in words if w)


def parse_scaled(text: str, *, whole: bool = False) -> ScaledValue | None:
    """Read a value with its letters.

    Of two letters the first qualifies and the second describes; ``-`` or ``/``
    stands for one that is absent. A letter alone behind a number qualifies if
    it is D, E, I, J or U and describes otherwise. Letters without a number
    mean that there is no value; then the descriptive letter must be there.

    Parameters
    ----------
    text : str
        A cell, in either case; spaces around number and letters do not matter.
    whole : bool
        Whether only a whole number is accepted.

    Returns
    -------
    ScaledValue or None
        What it says; None if the text is not such a value. An empty text is
        a value that is absent without a reason.

    Examples
    --------
    >>> parse_scaled("7.2UF")
    ScaledValue(value=7.2, qualifying='U', descriptive='F')
    >>> parse_scaled("C").meaning
    'equipment or another cause outside the ionosphere'
    """
    plain = text.strip()
    if not plain:
        return ScaledValue(value=math.nan)
    match = (_WHOLE if whole else _VALUE).fullmatch(plain)
    if match is None:
        return None
    number, letters = match.group(1), match.group(2).upper()
    if len(letters) == 1:
        qualifies = number is not None and letters in ALONE_QUALIFYING
        letters = letters + "-" if qualifies else "-" + letters
    first, second = (letters[0], letters[1]) if letters else ("-", "-")
    if first not in _NO_LETTER and first not in QUALIFYING:
        return None
    if second not in _NO_LETTER and second not in DESCRIPTIVE:
        return None
    qualifying = "" if first in _NO_LETTER else first
    descriptive = "" if second in _NO_LETTER else second
    if number is None:
        # Nothing was measured that a first letter could qualify.
        return ScaledValue(value=math.nan, descriptive=descriptive) if descriptive else None
    return ScaledValue(value=float(number), qualifying=qualifying, descriptive=descriptive)
