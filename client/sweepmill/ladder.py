"""The ladder of N: the only numbers of trajectories at which a stopping rule is judged."""


def rungs(at_least: int, cap: int) -> tuple[int, ...]:
    """``at_least`` · 2^(j/4) rounded down, distinct and below ``cap``, then ``cap`` itself.

    Computed in integers, so that every machine judges at the same N.
    """
    ladder: list[int] = []
    step = 0
    while (rung := _fourth_root(at_least**4 << step)) < cap:
        if not ladder or rung > ladder[-1]:
            ladder.append(rung)
        step += 1
    return (*ladder, cap)


def _fourth_root(value: int) -> int:
    """Largest integer whose fourth power is at most ``value``."""
    root = int(value**0.25) if value < 2**52 else 1 << (value.bit_length() // 4 + 1)
    while root**4 > value:
        root = (3 * root + value // root**3) // 4
    while (root + 1) ** 4 <= value:
        root += 1
    return root
