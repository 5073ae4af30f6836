"""Where the service is and who asks: address, token and owner, from arguments or the environment."""

import getpass
import os
import re
from dataclasses import dataclass, field

import httpx

from sweepmill.errors import BadSettings

DEFAULT_URL = "http://127.0.0.1:8765"
_OWNER = re.compile(r"[A-Za-z0-9._-]{1,64}")
_LOOPBACK = ("localhost", "127.0.0.1", "::1")


@dataclass(frozen=True)
class Connection:
    """Address of a service and the credentials to use there."""

    url: str
    owner: str
    token: str | None = field(default=None, repr=False)

    @property
    def headers(self) -> dict[str, str]:
        """Headers that every request carries."""
        bearer = {"Authorization": f"Bearer {self.token}"} if self.token else {}
        return {"Sweepmill-Owner": self.owner, **bearer}

    @property
    def loopback(self) -> bool:
        """Whether the service runs on this machine, where proxies of the environment have no business."""
        return httpx.URL(self.url).host in _LOOPBACK


def connection(url: str | None = None, token: str | None = None, owner: str | None = None) -> Connection:
    """Fill in what is not given from SWEEPMILL_URL, SWEEPMILL_TOKEN and SWEEPMILL_OWNER.

    Raises BadSettings for what cannot be used.
    """
    return Connection(
        url=_checked_url(url or os.environ.get("SWEEPMILL_URL") or DEFAULT_URL),
        owner=_checked_owner(owner or os.environ.get("SWEEPMILL_OWNER") or login_name()),
        token=_checked_token(token or os.environ.get("SWEEPMILL_TOKEN") or None),
    )


def login_name() -> str:
    """The login name, reduced to the characters an owner may have; `local` where there is none."""
    try:
        name = getpass.getuser()
    except (OSError, KeyError, ImportError):  # no entry for this user id, or no such database at all
        name = ""
    return re.sub(r"[^A-Za-z0-9._-]+", "-", name).strip("-")[:64] or "local"


def _checked_url(url: str) -> str:
    try:
        parsed = httpx.URL(url)
    except httpx.InvalidURL as error:
        raise BadSettings(f"{url!r} is not the address of a service: {error}") from error
    if parsed.scheme not in ("http", "https") or not parsed.host:
        raise BadSettings(f"{url!r} is not the address of a service: write it like {DEFAULT_URL}")
    return url.rstrip("/")


def _checked_owner(owner: str) -> str:
    if not _OWNER.fullmatch(owner):
        raise BadSettings(f"owner {owner!r} must be 1 to 64 of the characters A-Z a-z 0-9 . _ -")
    return owner


def _checked_token(token: str | None) -> str | None:
    if token is not None and not (token.isascii() and token.isprintable() and " " not in token):
        raise BadSettings("the token has characters that no token has; was it copied completely?")
    return token
