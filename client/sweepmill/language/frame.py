"""Where signs are random: which outcomes of a circuit may be forced.

A random gate leaves its sites in a uniformly random Pauli frame: both outcomes of every Pauli product on such a site
are equally likely, whatever the state. A forced outcome needs such a site, else it may have probability 0, which a
state without signs cannot tell.

The walk follows the layers in time and keeps the sites that are certainly in such a frame. Gates map Pauli products
onto each other, so they leave the frame of a place that is random as a whole, and may carry it away from a place that
is random in part. Outcomes tell about the frame: every measurement and reset ends that of its sites.
"""

from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from sweepmill.errors import Fault
from sweepmill.language.gates import RANDOM_GATES
from sweepmill.language.geometry import listed
from sweepmill.language.rates import bounds

MOST_PASSES = 4  # through `repeat`, after which nothing is taken over from one to the next
MOST_NAMED = 8


class Spot(NamedTuple):
    """Where a step acts at once: a place, or all that random places may be."""

    sites: tuple[int, ...]
    definite: bool
    """A place, not all places that can be drawn."""
    reached: bool
    """Whether a step that certainly happens acts on every site."""


def forced_faults(program: Mapping[str, Any], sites: int, periodic: bool, layers: int, path: str) -> tuple[Fault, ...]:
    """The forced steps of a circuit in normal form, repeated for ``layers`` layers, that may have probability 0."""
    walk = _Walk(sites, periodic)
    walk.layers(program["before"], "before", first=True)
    walk.repeat(program["repeat"], layers, "repeat")
    walk.layers(program["after"], "after", first=True)
    return tuple(Fault(f"{path}.{where}.forced", message) for where, message in walk.faults.items())


class _Walk:
    """The sites in a random frame, as the layers pass."""

    def __init__(self, sites: int, periodic: bool) -> None:
        self.sites, self.periodic = sites, periodic
        self.framed: set[int] = set()
        self.ended: dict[int, str] = {}  # site: path of the step that ended its frame
        self.faults: dict[str, str] = {}

    def repeat(self, layers: Sequence[Any], number: int, path: str) -> None:
        """The first layers, then passes until the next would begin with no less than the one before."""
        span = len(layers)
        self.layers(layers[:number], path, first=True)
        number, passes = max(number - span, 0), 0
        while number >= span:
            begun = set(self.framed)
            self.layers(layers, path, first=False)
            number, passes = number - span, passes + 1
            if self.framed >= begun:  # more sites in a random frame never leave fewer: the other passes are alike
                number %= span
            elif passes >= MOST_PASSES:
                self.framed.clear()
        self.layers(layers[:number], path, first=False)

    def layers(self, layers: Sequence[Any], path: str, first: bool) -> None:
        """Layers one after another; ``first`` where gates fixed for a trajectory act for the first time."""
        for index, layer in enumerate(layers):
            for number, step in enumerate(layer):
                for spot in _spots(step["on"], self.sites, self.periodic):
                    self._act(step, spot, f"{path}[{index}][{number}]", first)

    def _act(self, step: Any, spot: Spot, path: str, first: bool) -> None:
        if "choose" in step:
            self._choose(step["choose"], spot, f"{path}.choose", first)
        elif bounds(step.get("rate", 1))[1] == 0:
            return
        elif "apply" in step:
            self._gate(step, spot, path, first)
        elif "measure" in step or "reset" in step:
            if step.get("forced"):
                self._check(spot, path)
            self._end(spot, path)

    def _choose(self, branches: Sequence[Any], spot: Spot, path: str, first: bool) -> None:
        """Only what every branch leaves is certain."""
        begun = self.framed.intersection(spot.sites)
        left = set(spot.sites)
        for index, branch in enumerate(branches):
            if bounds(branch["weight"])[1] == 0:
                continue
            self.framed |= begun
            for number, step in enumerate(branch["steps"]):
                self._act(step, spot, f"{path}[{index}].steps[{number}]", first)
            left &= self.framed
            self.framed.difference_update(spot.sites)
        self.framed |= left

    def _gate(self, step: Any, spot: Spot, path: str, first: bool) -> None:
        fixed = step.get("fixed")
        drawn = step["apply"] in RANDOM_GATES and (fixed is None or (fixed == "trajectory" and first))
        if drawn and spot.reached and step.get("rate", 1) == 1:
            self.framed.update(spot.sites)
        elif step.get("rotated") or not self.framed.issuperset(spot.sites):
            self._end(spot, path)

    def _end(self, spot: Spot, path: str) -> None:
        for site in self.framed.intersection(spot.sites):
            self.framed.remove(site)
            self.ended[site] = path

    def _check(self, spot: Spot, path: str) -> None:
        bare = [site for site in spot.sites if site not in self.framed]
        if path in self.faults or not bare or (spot.definite and len(bare) < len(spot.sites)):
            return
        since = next((self.ended[site] for site in bare if site in self.ended), "the start")
        self.faults[path] = (
            f"the outcome could have probability 0, because no random gate certainly acted on {_named(bare)} since "
            f"{since}: put a random gate on every such place before it in time"
        )


def _spots(on: Any, sites: int, periodic: bool) -> list[Spot]:
    places = listed(on, sites, periodic)
    if isinstance(on, Mapping) and "random_pairs" in on:
        return [Spot(tuple(range(sites)), False, "count" not in on["random_pairs"])]
    if isinstance(on, Mapping) and "random_sequential" in on:
        rule: Mapping[str, Any] = on["random_sequential"]
        spots = [Spot(place, False, False) for place in places]
        if rule["of"] == "bonds":  # in any order
            spots = [Spot(tuple(sorted({site for place in places for site in place})), False, False)]
        return spots * min(int(rule["count"]), 2)  # twice: a place may be drawn again
    return [Spot(place, True, True) for place in places]


def _named(sites: Sequence[int]) -> str:
    more = f" and {len(sites) - MOST_NAMED} more" if len(sites) > MOST_NAMED else ""
    return f"{'site' if len(sites) == 1 else 'sites'} {', '.join(map(str, sites[:MOST_NAMED]))}{more}"
