"""Lists and plurals in sentences."""

from collections.abc import Iterable


def listed(items: Iterable[object]) -> str:
    """The items separated by commas, numbers without needless digits; long lists shortened in the middle."""
    texts = [f"{item:g}" if isinstance(item, float) else str(item) for item in items]
    return ", ".join(texts if len(texts) <= 6 else [*texts[:2], "...", *texts[-2:]])
