"""A process with a local pool: prints the ids of its workers, then waits to be killed."""

import json
import signal

from support.pools import worker_pids
from sweepmill_service.pool import LocalPool


def main() -> None:
    """Start two workers, as a service does."""
    pool = LocalPool(2)
    pool.open()
    print(json.dumps(sorted(worker_pids(pool).values())), flush=True)
    signal.pause()


if __name__ == "__main__":
    main()
