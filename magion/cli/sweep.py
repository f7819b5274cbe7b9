"""``magion sweep``."""

import csv
import hashlib
import json
import os
from collections.abc import Iterator
from contextlib import nullcontext
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from magion.cli.arguments import NUMBER, PLACE, ionosphere_from, ionosphere_options

if TYPE_CHECKING:
    from magion.answers.sweep import Engine, SweepRow
    from magion.formats.contacts import BadRow, Contact
    from magion.geometry import Place

_MOST_NAMED = 20
_MOST_WORKERS = 256


@click.command("sweep", short_help="the answer for every row of a log or list of paths")
@click.argument("file", metavar="FILE", type=click.Path(path_type=Path))
@click.option("--output", type=click.Path(path_type=Path), required=True, help="CSV to write.")
@click.option("--at", "here", type=PLACE, help="Your place, where an ADIF log does not say it.")
@click.option("--step", "step_min", type=NUMBER, default=60.0, show_default=True,
              help="Rows are answered for the nearest step [minutes].")  # fmt: skip
@click.option("--workers", type=int, help="Processes; all cores by default.")
@click.option("--scheduler", metavar="ADDRESS", help="A cluster of dask.distributed instead.")
@ionosphere_options
def command(
    file: Path,
    output: Path,
    here: "Place | None",
    step_min: float,
    workers: int | None,
    scheduler: str | None,
    **known: Any,
) -> None:
    """Wave, hand, state, MUFs and margin for every row of a file.

    FILE is CSV (time_utc,from,to,frequency_mhz) or ADIF (.adi, .adif; the
    partner transmits, you receive). Rows come out in their order. A run that
    is broken off goes on where it was when the same command is given again.

    \b
    Example:
      magion sweep examples/contacts.adi --at 46.50,11.35 --flux 130 --output answers.csv
    """  # noqa: D301
    from magion.answers.sweep import sweep
    from magion.cli.writing import require_target
    from magion.errors import InputError, require_range
    from magion.formats.contacts import BadRow, read_contacts

    if scheduler is not None and workers is not None:
        raise InputError("--workers and --scheduler contradict each other; give one")
    if workers is not None:
        require_range("the number of workers", workers, 1, _MOST_WORKERS)
    require_range("the step", step_min, 1.0, 360.0, "minutes")
    require_target(output)
    sky = ionosphere_from(**known)
    run = _Run(output, _fingerprint(file, here, step_min, known))
    done = run.last_line()
    bad: list[BadRow] = []
    with _engine(workers, scheduler) as engine, _Progress(file) as seen, run:
        rows = _fresh(read_contacts(file, here), done, bad, seen)
        for row in sweep(rows, sky, engine=engine, step_min=step_min):
            if isinstance(row, BadRow):
                bad.append(row)
            else:
                run.write(row)
        run.finish()
    _report(bad, run.rows)


def _fresh(
    rows: "Iterator[Contact | BadRow]", done: int, bad: "list[BadRow]", seen: Any
) -> "Iterator[Contact | BadRow]":
    """Rows that are not answered yet; bad ones among the old are reported again."""
    from magion.formats.contacts import BadRow

    for row in rows:
        seen(row.line)
        if row.line > done:
            yield row
        elif isinstance(row, BadRow):
            bad.append(row)


def _engine(workers: int | None, scheduler: str | None) -> Any:
    from magion.answers.engines import Cluster, Pool
    from magion.answers.sweep import in_this_process

    if scheduler is not None:
        return Cluster(scheduler)
    count = workers or os.cpu_count() or 1
    plain: Engine = in_this_process
    return nullcontext(plain) if count == 1 else Pool(count)


class _Progress:
    """A bar over the lines of a file, on a terminal only."""

    def __init__(self, file: Path) -> None:
        self._file = file
        self._bar: Any = None

    def __enter__(self) -> Any:
        import sys

        if not sys.stderr.isatty() or not self._file.is_file():
            return lambda line: None
        with self._file.open("rb") as raw:
            lines = sum(chunk.count(b"\n") for chunk in iter(lambda: raw.read(1 << 20), b""))
        bar: Any = click.progressbar(length=lines + 1, label="sweeping", file=sys.stderr)
        self._bar = bar
        bar.__enter__()
        return lambda line: bar.update(max(0, line - bar.pos))

    def __exit__(self, *error: object) -> None:
        if self._bar is not None:
            self._bar.__exit__(*error)


def _fingerprint(file: Path, here: "Place | None", step_min: float, known: Any) -> str:
    """What makes two runs the same: the file's start and size, and the options."""
    digest = hashlib.sha256()
    if file.is_file():
        with file.open("rb") as raw:
            digest.update(raw.read(1 << 20))
        digest.update(str(file.stat().st_size).encode())
    said = {k: str(v) for k, v in known.items() if v is not None}
    digest.update(json.dumps([str(here), step_min, said], sort_keys=True).encode())
    return digest.hexdigest()


class _Run:
    """The output: ``OUT.partial`` while it grows, renamed when it is complete."""

    def __init__(self, output: Path, fingerprint: str) -> None:
        self.output = output
        self.partial = output.with_name(output.name + ".partial")
        self.key = output.with_name(output.name + ".partial.key")
        self.fingerprint = fingerprint
        self.rows = 0
        self._file: Any = None
        self._table: Any = None

    def last_line(self) -> int:
        """Line of the input that the last whole row of an earlier run answers."""
        from magion.errors import InputError
        from magion.formats.tables import printable

        if not self.partial.exists():
            return 0
        if not self.key.exists() or self.key.read_text("utf-8").strip() != self.fingerprint:
            raise InputError(
                f"{printable(self.partial.name)} belongs to another run (file or options differ); "
                "remove it, or give another --output"
            )
        last, end, self.rows = 0, 0, -1
        with self.partial.open("rb") as raw:
            for line in raw:
                if not line.endswith(b"\n"):
                    break
                end += len(line)
                self.rows += 1
                if self.rows:
                    last = int(line.split(b",", 1)[0])
        with self.partial.open("r+b") as raw:
            raw.truncate(end)
        self.rows = max(self.rows, 0)
        return last

    def __enter__(self) -> "_Run":
        from magion.render.sweep import COLUMNS

        fresh = not self.partial.exists() or self.partial.stat().st_size == 0
        self.key.write_text(self.fingerprint + "\n", encoding="utf-8")
        self._file = self.partial.open("a", encoding="utf-8", newline="")
        self._table = csv.writer(self._file, lineterminator="\n")
        if fresh:
            self._table.writerow(COLUMNS)
        return self

    def __exit__(self, *error: object) -> None:
        self._file.close()
        if self.rows == 0:  # nothing to go on with
            self.partial.unlink(missing_ok=True)
            self.key.unlink(missing_ok=True)

    def write(self, row: "SweepRow") -> None:
        """Add one row."""
        from magion.render.sweep import cells

        self._table.writerow(cells(row))
        self.rows += 1
        if self.rows % 1000 == 0:
            self._file.flush()

    def finish(self) -> None:
        """Put the complete file in its place."""
        self._file.close()
        os.replace(self.partial, self.output)
        self.key.unlink(missing_ok=True)


def _report(bad: "list[BadRow]", rows: int) -> None:
    for row in bad[:_MOST_NAMED]:
        click.echo(f"magion: line {row.line} skipped: {row.reason}", err=True)
    if len(bad) > _MOST_NAMED:
        click.echo(f"magion: ... and {len(bad) - _MOST_NAMED} more", err=True)
    click.echo(f"magion: {rows} rows answered, {len(bad)} skipped", err=True)
