"""A progress bar, on a terminal only."""

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager

import click

_STEPS = 1000


@contextmanager
def shown(label: str) -> Iterator[Callable[[float], None] | None]:
    """Show how much is done while a call runs.

    Parameters
    ----------
    label : str
        What runs.

    Yields
    ------
    callable or None
        To be called with the share that is done; None where standard error is
        no terminal.
    """
    if not sys.stderr.isatty():
        yield None
        return
    with click.progressbar(length=_STEPS, label=label, file=sys.stderr) as bar:
        yield lambda share: bar.update(max(0, int(share * _STEPS) - bar.pos))
