"""Errors of the project's own.

Wrong input and input outside a model are errors; "the physics says no" (no
reflection, above the MUF, field across the ray) is a value with a reason and
never appears here.
"""


class MagionError(Exception):
    """Base of every error that magion raises on purpose."""


class InputError(MagionError, ValueError):
    """An input is wrong: the message names the value and what is accepted."""


class OutsideModelError(MagionError, ValueError):
    """A right input lies outside a model: the message gives the covered range."""


def require_range(name: str, value: float, low: float, high: float, unit: str = "") -> float:
    """Return `value` if it is a number within [low, high].

    Parameters
    ----------
    name : str
        What the value is, as the user knows it.
    value : float
        The value.
    low, high : float
        Accepted range, both ends included.
    unit : str
        Unit for the message.

    Returns
    -------
    float
        The value, unchanged.

    Raises
    ------
    InputError
        If the value is not a number within the range.
    """
    if not low <= value <= high:
        tail = f" {unit}" if unit else ""
        raise InputError(f"{name} is {value:.10g}{tail}; accepted: {low:g} to {high:g}{tail}")
    return value
