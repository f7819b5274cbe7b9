"""Where jobs run: in this process, in several, or on an existing cluster."""

from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from contextlib import AbstractContextManager
from importlib import import_module
from types import TracebackType
from typing import Any, Self

from magion.answers.bulk import PathDay
from magion.answers.inputs import IonosphereInput
from magion.answers.sweep import JobResult, run_job
from magion.errors import InputError


class Pool(AbstractContextManager["Pool"]):
    """Processes of this machine, by the standard library.

    Parameters
    ----------
    workers : int
        How many [1].
    """

    def __init__(self, workers: int) -> None:
        self._pool = ProcessPoolExecutor(max_workers=workers)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._pool.shutdown(wait=error is None, cancel_futures=True)

    def __call__(self, jobs: Sequence[PathDay], ionosphere: IonosphereInput) -> Iterator[JobResult]:
        """Map jobs.

        Parameters
        ----------
        jobs : sequence of PathDay
            The jobs.
        ionosphere : IonosphereInput
            What is known of the ionosphere.

        Returns
        -------
        iterator of (tuple of Found, or str)
            Results in the order of the jobs.
        """
        return iter(self._pool.map(run_job, jobs, [ionosphere] * len(jobs)))


class Cluster(AbstractContextManager["Cluster"]):
    """A cluster of dask.distributed that is there already.

    Parameters
    ----------
    address : str
        Of its scheduler, such as ``tcp://host:8786``.

    Raises
    ------
    InputError
        If dask.distributed is not installed, or the scheduler does not answer.
    """

    def __init__(self, address: str) -> None:
        try:
            distributed: Any = import_module("distributed")
        except ImportError:
            raise InputError(
                "--scheduler needs dask.distributed; install magion with its extra 'cluster'"
            ) from None
        try:
            self._client: Any = distributed.Client(address, timeout="5s", set_as_default=False)
        except (OSError, ValueError, TimeoutError) as error:
            first = str(error).splitlines()[0] if str(error) else type(error).__name__
            raise InputError(f"the scheduler {address} does not answer: {first}") from None

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._client.close()

    def __call__(self, jobs: Sequence[PathDay], ionosphere: IonosphereInput) -> Iterator[JobResult]:
        """Map jobs; one that is lost with its worker is run again by another.

        Parameters
        ----------
        jobs : sequence of PathDay
            The jobs.
        ionosphere : IonosphereInput
            What is known of the ionosphere.

        Returns
        -------
        iterator of (tuple of Found, or str)
            Results in the order of the jobs.
        """
        known = self._client.scatter(ionosphere, broadcast=True) if jobs else None
        futures = self._client.map(run_job, list(jobs), ionosphere=known, pure=False, retries=3)
        return iter(self._client.gather(futures))
