"""Figures as files: PNG, SVG or PDF."""

import io
from pathlib import PurePath
from typing import TYPE_CHECKING, Final

from magion.errors import InputError

if TYPE_CHECKING:
    from matplotlib.figure import Figure

ENDINGS: Final = ("png", "svg", "pdf")


def require_ending(name: str) -> str:
    """The kind of figure that a file's name asks for.

    Parameters
    ----------
    name : str
        Name of the file.

    Returns
    -------
    str
        "png", "svg" or "pdf".

    Raises
    ------
    InputError
        If the name ends otherwise.
    """
    ending = PurePath(name).suffix.lower().lstrip(".")
    if ending not in ENDINGS:
        shown = f".{ending}" if ending.isprintable() and ending else "no known ending"
        raise InputError(f"the figure's file has {shown}; accepted: .png, .svg or .pdf")
    return ending


def encoded(figure: "Figure", ending: str) -> bytes:
    """A figure as the bytes of a file, the same for the same figure.

    Parameters
    ----------
    figure : Figure
        The figure.
    ending : str
        "png", "svg" or "pdf".

    Returns
    -------
    bytes
        The file's content.
    """
    import matplotlib as mpl

    out = io.BytesIO()
    undated = {"png": None, "svg": {"Date": None}, "pdf": {"CreationDate": None}}[ending]
    with mpl.rc_context({"svg.hashsalt": "magion", "svg.fonttype": "none"}):
        figure.savefig(out, format=ending, dpi=150, metadata=undated)
    return out.getvalue()
