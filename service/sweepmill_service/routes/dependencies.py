"""What routes need from the request: the runtime, the store, the owner, a key.

The dependencies are coroutines because they touch nothing that blocks; a plain function would cost a thread each.
"""

import re
from http import HTTPStatus
from typing import Annotated

from fastapi import Depends, Header, Path, Request

from sweepmill.errors import Fault
from sweepmill.identity import SHORTEST_PREFIX
from sweepmill_service.problems import Refusal
from sweepmill_service.runtime import Runtime
from sweepmill_service.store import Store

_PREFIX = re.compile(rf"[0-9a-f]{{{SHORTEST_PREFIX},64}}")
OWNER_PATTERN = r"^[A-Za-z0-9._-]{1,64}$"
EXAMPLE_KEY = "3b9f6c1e"


async def _runtime(request: Request) -> Runtime:
    runtime: Runtime = request.app.state.runtime
    return runtime


async def _store(request: Request) -> Store:
    """Raises Unavailable while the database is being opened."""
    runtime: Runtime = request.app.state.runtime
    return runtime.store


async def _key(
    key: Annotated[
        str,
        Path(
            description=f"Key, or an unambiguous prefix of at least {SHORTEST_PREFIX} hexadecimal digits",
            examples=[EXAMPLE_KEY],
            json_schema_extra={"pattern": f"^{_PREFIX.pattern}$"},
        ),
    ],
) -> str:
    """Raises Refusal (422) for what cannot be a prefix of a key."""
    if not _PREFIX.fullmatch(key):
        message = f"a key has {SHORTEST_PREFIX} to 64 of the digits 0-9 a-f, got {key[:80]!r}"
        raise Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, message, [Fault("path.key", message)])
    return key


RuntimeOf = Annotated[Runtime, Depends(_runtime)]
StoreOf = Annotated[Store, Depends(_store)]
KeyPrefix = Annotated[str, Depends(_key)]
Owner = Annotated[
    str,
    Header(
        alias="Sweepmill-Owner",
        pattern=OWNER_PATTERN,
        description="In whose name: requests, labels and priorities belong to owners",
        examples=["mara"],
    ),
]
