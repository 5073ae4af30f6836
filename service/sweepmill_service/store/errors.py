"""What looking up a key can raise."""

SHORTEST = 8


class ShortKey(ValueError):
    """A prefix with fewer than 8 digits, or with something else than lower-case hexadecimal digits."""

    def __init__(self, prefix: str) -> None:
        self.prefix = prefix
        super().__init__(f"{prefix!r} is not a key: give at least {SHORTEST} lower-case hexadecimal digits")


class UnknownKey(LookupError):
    """Nothing stored has a key that begins like this."""

    def __init__(self, what: str, prefix: str) -> None:
        self.what = what
        self.prefix = prefix
        super().__init__(f"no {what} has a key that begins with {prefix}")


class AmbiguousKey(LookupError):
    """Several keys begin like this."""

    def __init__(self, what: str, prefix: str, candidates: list[str]) -> None:
        self.what = what
        self.prefix = prefix
        self.candidates = candidates
        shown = ", ".join(key[:16] for key in candidates)
        super().__init__(f"several {what}s have a key that begins with {prefix}: {shown}")
