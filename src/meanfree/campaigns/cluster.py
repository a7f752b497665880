"""The same parts on a Dask cluster: each is computed there, sent back and written here.

Only a few parts more than there are threads are under way at a time, so that neither the
scheduler nor this process holds many. A worker that is lost costs the parts it was at.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

from meanfree.campaigns.campaign import Campaign
from meanfree.campaigns.part import Part, compute_part
from meanfree.errors import ComputationError, InputError

AHEAD = 2
"""Parts under way for each thread of the cluster."""

TRIES = 5
"""Times that a part is begun before losing its worker counts as its own fault."""

PATIENCE_S = 30.0


def on_cluster(campaign: Campaign, numbers: Sequence[int], scheduler: str) -> Iterator[Part]:
    """The parts, in the order in which they are done, by the workers of a running scheduler.

    Raises
    ------
    InputError
        ``dask.distributed`` is not installed, or nothing answers at that address.
    ComputationError
        A part fails, or no worker comes.
    """
    try:
        from distributed import Client, as_completed
    except ImportError:
        raise InputError.at(
            "--engine", "dask, which is not installed", "pip install 'meanfree[cluster]'"
        ) from None
    try:
        client = Client(scheduler, timeout=PATIENCE_S, set_as_default=False)
    except (OSError, TimeoutError, ValueError):
        raise InputError.at(
            "--scheduler",
            f"{scheduler}, where no scheduler answers",
            "the address that dask scheduler prints, such as tcp://host:8786",
        ) from None
    with client:
        try:
            client.wait_for_workers(1, timeout=PATIENCE_S)
        except TimeoutError:
            raise ComputationError(
                f"The scheduler at {scheduler} has no worker. Start some with: dask worker "
                f"{scheduler} --nthreads 1"
            ) from None
        threads = sum(client.nthreads().values())
        pending, tries = list(reversed(numbers)), dict.fromkeys(numbers, 0)
        # The campaign travels with each part: what is only kept on workers goes when they go.
        under_way: dict[Any, int] = {}

        def begin() -> Any:
            number = pending.pop()
            tries[number] += 1
            future = client.submit(compute_part, campaign.for_part(number), number, pure=False)
            under_way[future] = number
            return future

        ahead = min(len(pending), max(1, AHEAD * threads))
        running = as_completed([begin() for _ in range(ahead)], loop=client.loop)
        for future in running:
            number = under_way.pop(future)
            part = _result(future)
            if part is None:
                if tries[number] >= TRIES:
                    raise ComputationError(f"Workers were lost {TRIES} times at part {number}.")
                pending.append(number)
            future.release()
            if pending:
                running.add(begin())
            if part is not None:
                yield part


def _result(future: Any) -> Part | None:
    """The part, None where it was lost with its worker."""
    from concurrent.futures import CancelledError

    try:
        found: Part = future.result()
    except CancelledError:
        return None
    except ComputationError:
        raise
    except Exception as error:
        raise ComputationError(f"A part failed on the cluster: {error}") from error
    return found
