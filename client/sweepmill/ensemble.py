"""An ensemble: all trajectories of one circuit family with every parameter fixed."""

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

from sweepmill.frozen import FrozenTable, freeze, thaw
from sweepmill.identity import key_of, key_words
from sweepmill.language.geometry import number_of_places
from sweepmill.revisions import FAMILY_REVISIONS

LAYERED = "layered"
PROGRAM = ("before", "repeat", "after")
"""Parameters of a layered circuit that are the circuit itself: lists of layers, each a list of steps."""

_TAIL: dict[str, Any] = {"layers": None, "replicate": 0, "engine": "auto"}
# Parameters of each family in table order; a value is the default that a normal form omits, None means required.
FAMILY_PARAMETERS: dict[str, dict[str, Any]] = {
    "hybrid-clifford": {
        "sites": None,
        "measurement_rate": None,
        "boundary": "periodic",
        "initial_state": "zeros",
        "references": 0,
        "scrambling_layers": 0,
        **_TAIL,
    },
    "hybrid-clifford-square": {
        "width": None,
        "height": None,
        "measurement_rate": None,
        "boundary": "periodic",
        "initial_state": "zeros",
        **_TAIL,
    },
    "hybrid-clifford-long-range": {
        "sites": None,
        "exponent": None,
        "measurement_rate": None,
        "boundary": "periodic",
        "initial_state": "zeros",
        **_TAIL,
    },
    "projective-ising": {"sites": None, "bond_rate": None, "boundary": "periodic", **_TAIL},
    "edge-bath": {"sites": None, **_TAIL},
    "rotated-clifford": {"sites": None, "ends": "open", **_TAIL},
    LAYERED: {
        "sites": None,
        "boundary": "periodic",
        "initial_state": "zeros",
        **_TAIL,
        "before": (),
        "repeat": None,
        "after": (),
    },
}


@dataclass(frozen=True)
class Ensemble:
    """Family and complete parameters (``sites``, ``layers`` … resolved to numbers).

    The circuit of a layered ensemble is three parameters of nested tuples and tables that cannot be changed.
    ``revision`` is the family revision its key was made with. ``labels`` are what a specification calls the ensemble
    by, such as {"circuit": "weak links", "p": 0.1}: columns of its table, not part of the identity.
    """

    family: str
    parameters: Mapping[str, Any]
    revision: int
    labels: Mapping[str, float | str] = field(default_factory=FrozenTable, compare=False)

    @classmethod
    def of(cls, family: str, **parameters: Any) -> "Ensemble":
        """An ensemble of the current revision; omitted parameters take their defaults. Raises ValueError."""
        table = FAMILY_PARAMETERS.get(family)
        if table is None:
            raise ValueError(f"unknown circuit family {family!r}: one of {', '.join(sorted(FAMILY_PARAMETERS))}")
        if unknown := parameters.keys() - table.keys():
            raise ValueError(f"{family} has no parameter {', '.join(sorted(unknown))}")
        complete: dict[str, Any] = {}
        for name, default in table.items():
            value = parameters.get(name, default)
            if value is None:
                raise ValueError(f"{family} needs the parameter {name}")
            complete[name] = freeze(value)
        return cls(family, complete, FAMILY_REVISIONS[family])

    @classmethod
    def from_normal_form(cls, form: Mapping[str, Any]) -> "Ensemble":
        """The inverse of :meth:`normal_form`, keeping the revision it was stored with."""
        parameters = {name: value for name, value in form.items() if name not in ("family", "revision")}
        ensemble = cls.of(form["family"], **parameters)
        return cls(ensemble.family, ensemble.parameters, form["revision"])

    def normal_form(self) -> dict[str, Any]:
        """What the key is the hash of: parameters that differ from their defaults, family and revision."""
        table = FAMILY_PARAMETERS[self.family]
        changed = {name: thaw(value) for name, value in self.parameters.items() if value != table[name]}
        return {"family": self.family, "revision": self.revision, **changed}

    @cached_property
    def key(self) -> str:
        """SHA-256 of the canonical normal form."""
        return key_of(self.normal_form())

    @property
    def key_words(self) -> tuple[int, int]:
        """The two 32-bit words that seed the random words of every trajectory."""
        return key_words(self.key)

    @cached_property
    def columns(self) -> Mapping[str, Any]:
        """What a table can say about the ensemble: its scalar parameters, and the labels before ``layers``."""
        scalars = {name: value for name, value in self.parameters.items() if name not in PROGRAM}
        return {n: v for n, v in scalars.items() if n not in _TAIL} | {**self.labels} | {n: scalars[n] for n in _TAIL}

    @property
    def sites(self) -> int:
        """Number of sites, reference qubits not counted."""
        if self.family == "hybrid-clifford-square":
            return int(self.parameters["width"] * self.parameters["height"])
        return int(self.parameters["sites"])

    @property
    def layers(self) -> int:
        """Number of layers that can be read: all but those of ``before``."""
        return self.repeated + len(self.parameters.get("after", ()))

    @property
    def repeated(self) -> int:
        """Number of layers that unit cells are made of: those of ``layers`` without those of ``after``."""
        return int(self.parameters["layers"])

    @property
    def cell(self) -> int:
        """Layers of the unit cell in time, after which the circuit repeats."""
        if self.family == LAYERED:
            return len(self.parameters["repeat"])
        return 4 if self.family == "hybrid-clifford-square" else 2

    @property
    def periodic(self) -> bool:
        """Whether site L-1 neighbors site 0."""
        return self.parameters.get("boundary") == "periodic" or self.parameters.get("ends") == "ring"

    @property
    def references(self) -> int:
        """Number of reference qubits, which no layer but their own touches."""
        return self._swapped_in if self.family == LAYERED else int(self.parameters.get("references", 0))

    @cached_property
    def _swapped_in(self) -> int:
        layers = (*self.parameters["before"], *self.parameters["after"])
        places = [step["on"] for layer in layers for step in layer if "swap_in" in step]
        return sum(number_of_places(on, self.sites, self.periodic) for on in places)

    @property
    def signed(self) -> bool:
        """Whether the signed simulation samples it."""
        return bool(self.parameters.get("engine", "auto") == "reference")

    @property
    def initial_state(self) -> str:
        """Of every site of the chain: zeros, plus or mixed."""
        begins = "plus" if self.family == "projective-ising" else "zeros"
        return str(self.parameters.get("initial_state", begins))

    @cached_property
    def forcing(self) -> str | None:
        """The field of the circuit by which outcomes are forced, be it by gates turned sideways."""
        if self.family == "rotated-clifford":
            return "family"
        steps = ((name, step) for name in PROGRAM for step in _steps(self.parameters.get(name, ())))
        return next((name for name, step in steps if step.get("forced") or step.get("rotated")), None)

    @cached_property
    def measures_before(self) -> bool:
        """Whether a layer of ``before`` records an outcome."""
        steps = _steps(self.parameters.get("before", ()))
        return any("measure" in step and step.get("recorded", True) for step in steps)

    @property
    def shape(self) -> tuple[str | int | None, ...]:
        """What decides which observations can be read off, and their coordinates."""
        sizes = (self.sites, self.references, self.layers, self.repeated, self.cell, self.periodic)
        records = (self.initial_state, self.forcing, self.measures_before)
        return self.family, str(self.parameters.get("engine", "auto")), *sizes, *records


def _steps(layers: Iterable[Any]) -> Iterator[Mapping[str, Any]]:
    """All steps of some layers, those in branches of choices included."""
    for layer in layers:
        for step in layer:
            yield step
            yield from _steps(branch["steps"] for branch in step.get("choose", ()))
