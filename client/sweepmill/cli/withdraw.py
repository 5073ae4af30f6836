"""sweepmill withdraw"""

from sweepmill.cli.options import Key, Owner, Url
from sweepmill.client import Client
from sweepmill.text import short


def withdraw(key: Key, url: Url = None, owner: Owner = None) -> None:
    """Withdraw your request for a sweep.

    Nothing that was sampled is deleted. The sweep goes on while somebody else requests it, and submitting it again
    restores it.

    Example: sweepmill withdraw 3b9f6c1e
    """
    with Client(url, owner=owner) as client:
        status = client.sweep(key).withdraw()
    others = ", ".join(request.owner for request in status.requests)
    rest = f"goes on for {others}" if others else f"is {status.state}"
    print(f"request withdrawn; sweep {short(status.key)} {rest}")
