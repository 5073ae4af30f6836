"""sweepmill pool"""

from sweepmill.cli.options import Url
from sweepmill.client import Client
from sweepmill.messages import PoolStatus
from sweepmill.text import aligned, count


def pool(url: Url = None) -> None:
    """Show the workers of a service and what they compute.

    Example: sweepmill pool
    """
    with Client(url) as client:
        status = client.pool()
    print(_summary(status))
    if status.workers:
        rows = [[w.name, w.address, w.threads, ", ".join(w.computing) or "nothing"] for w in status.workers]
        print(aligned(("worker", "address", "threads", "computing"), rows))


def _summary(status: PoolStatus) -> str:
    state = "ready" if status.ready else f"not ready: {status.reason or 'no reason given'}"
    paused = f" ({status.reason})" if status.ready and status.reason else ""
    return (
        f"{state}{paused}; {status.cores} cores {100 * status.busy_fraction:.0f} % busy, "
        f"{status.trajectories_per_second:.3g} trajectories/s; "
        f"batches: {status.in_flight} of {status.window} in flight, {count(status.batches_committed)} committed"
    )
