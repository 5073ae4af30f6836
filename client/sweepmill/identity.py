"""Identity of ensembles, observations and sweeps: SHA-256 of the RFC 8785 canonical JSON of their normal form."""

import hashlib
from collections.abc import Mapping
from typing import Any

import rfc8785

KEY_DIGITS = 64
SHORTEST_PREFIX = 8


def canonical(form: Mapping[str, Any]) -> str:
    """Canonical JSON text (RFC 8785) of a normal form."""
    return rfc8785.dumps(dict(form)).decode()


def key_of(form: Mapping[str, Any]) -> str:
    """Key of a normal form: 64 lower-case hexadecimal digits."""
    return hashlib.sha256(canonical(form).encode()).hexdigest()


def key_words(key: str) -> tuple[int, int]:
    """The two 32-bit words that seed the counter-based generator: the first 64 bits of an ensemble key."""
    return int(key[:8], 16), int(key[8:16], 16)
