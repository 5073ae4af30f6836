"""A small drawing board for SVG."""

import math
from collections.abc import Sequence
from dataclasses import dataclass

Point = tuple[float, float]


@dataclass(frozen=True)
class Frame:
    """A panel at (left, y) in pixels with a logarithmic axis to the right and a linear one upwards from zero."""

    left: float
    y: float
    width: float
    height: float
    x_range: tuple[float, float]
    y_most: float

    def at(self, x: float, y: float) -> Point:
        """Pixels of a point."""
        least, most = self.x_range
        right = math.log(x / least) / math.log(most / least)
        return self.left + self.width * right, self.y + self.height * (1 - y / self.y_most)


class Canvas:
    """Collects elements; colors of texts and lines come from the page's style by class."""

    def __init__(self, width: float, height: float) -> None:
        self.width, self.height = width, height
        self._parts: list[str] = []

    def line(self, points: Sequence[Point], ink: str) -> None:
        """A curve."""
        self._parts.append(f'<polyline class="curve" points="{_joined(points)}" style="stroke:{ink}"/>')

    def area(self, points: Sequence[Point], ink: str) -> None:
        """A band, shaded."""
        self._parts.append(f'<polygon points="{_joined(points)}" style="fill:{ink};opacity:.16"/>')

    def dot(self, point: Point, ink: str) -> None:
        """One measured point."""
        self._parts.append(f'<circle cx="{point[0]:.1f}" cy="{point[1]:.1f}" r="2" style="fill:{ink}"/>')

    def dotted(self, begin: float, end: float, y: float) -> None:
        """A horizontal guide."""
        self._parts.append(f'<line class="guide" x1="{begin:.1f}" x2="{end:.1f}" y1="{y:.1f}" y2="{y:.1f}"/>')

    def tick(self, x: float, y: float) -> None:
        """A tick on a vertical axis."""
        self._parts.append(f'<line class="axis" x1="{x - 3:.1f}" x2="{x:.1f}" y1="{y:.1f}" y2="{y:.1f}"/>')

    def box(self, frame: Frame) -> None:
        """The left and lower edge of a panel."""
        left, low = frame.left, frame.y + frame.height
        points = [(left, frame.y), (left, low), (left + frame.width, low)]
        self._parts.append(f'<polyline class="axis" points="{_joined(points)}"/>')

    def text(self, x: float, y: float, text: str, kind: str) -> None:
        """Text, escaped already."""
        self._parts.append(f'<text class="{kind}" x="{x:.1f}" y="{y:.1f}">{text}</text>')

    def upright(self, x: float, y: float, text: str) -> None:
        """Text along a vertical axis."""
        turn = f'transform="rotate(-90 {x:.1f} {y:.1f})"'
        self._parts.append(f'<text class="label middle" x="{x:.1f}" y="{y:.1f}" {turn}>{text}</text>')

    def svg(self, title: str) -> str:
        """The whole drawing as one element."""
        head = f'<svg viewBox="0 0 {self.width:g} {self.height:g}" role="img" aria-label="{title}">'
        return "\n".join([head, f"<title>{title}</title>", *self._parts, "</svg>"])


def ticks(least: float, most: float) -> list[float]:
    """Round numbers for a logarithmic axis: powers of ten, with 2 and 5 between them where there are few."""
    powers = range(math.floor(math.log10(least)), math.ceil(math.log10(most)) + 1)
    factors = (1, 2, 5) if most / least < 300 else (1,)
    return [10.0**power * factor for power in powers for factor in factors if least <= 10.0**power * factor <= most]


def even_ticks(most: float, about: int = 6) -> list[float]:
    """Multiples of 1, 2 or 5 times a power of ten from zero on, at most so many steps."""
    power = 10.0 ** math.floor(math.log10(most / about))
    step = next(factor * power for factor in (1, 2, 5, 10) if most / (factor * power) <= about)
    return [index * step for index in range(int(most / step) + 1)]


def _joined(points: Sequence[Point]) -> str:
    return " ".join(f"{x:.1f},{y:.1f}" for x, y in points)
