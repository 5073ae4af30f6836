"""The sweep specification: what a user submits. One strict model; TOML, JSON and Python objects alike."""

import json
import tomllib
from collections.abc import Iterable, Mapping, Sequence
from functools import cached_property
from pathlib import Path
from typing import Annotated, Any, NamedTuple

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field, ValidationError

from sweepmill.axes import Integer, nonempty
from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.errors import Fault, SpecificationError
from sweepmill.families import CircuitBlock
from sweepmill.families.block import Block
from sweepmill.faults import TOO_DEEP, faults_of
from sweepmill.goals import Goal, goal_faults, placed, resolved
from sweepmill.identity import canonical, key_of
from sweepmill.language.refusal import printable
from sweepmill.observation import Observation
from sweepmill.observation.blame import blamed
from sweepmill.stop import Stop
from sweepmill.times import as_tuple

MOST_FAULTS = 100


class Point(NamedTuple):
    """One ensemble of a sweep and its cap."""

    ensemble: Ensemble
    cap: int


class Expansion(NamedTuple):
    """Ensembles of one circuit block and its faults; the paths to blame begin within the block."""

    ensembles: list[tuple[str, Ensemble]]
    faults: list[Fault]


class NamedObservation(NamedTuple):
    """An observation under the name it has in its sweep."""

    name: str
    observation: Observation


def _blocks(value: Any) -> Any:
    return (value,) if isinstance(value, Mapping | Block) else as_tuple(value)


class Sweep(BaseModel):
    """Circuits whose fields may be axes, observations and a stopping rule.

    Raises :class:`SpecificationError` with every fault, each with its path; an instance is always valid.
    """

    model_config = ConfigDict(frozen=True, extra="forbid")

    circuit: Annotated[tuple[CircuitBlock, ...], BeforeValidator(_blocks), AfterValidator(nonempty)]
    observe: Annotated[tuple[Observation, ...], BeforeValidator(as_tuple), AfterValidator(nonempty)]
    stop: Stop
    label: Annotated[str, Field(max_length=200), AfterValidator(printable)] | None = None
    priority: Annotated[Integer, Field(ge=-10, le=10)] = 0

    def __init__(self, **fields: Any) -> None:
        try:
            faults = self._take(fields)
        except RecursionError:
            faults = [TOO_DEEP]
        if faults:
            raise SpecificationError(faults)

    def _take(self, fields: Mapping[str, Any]) -> list[Fault]:
        try:
            super().__init__(**fields)
        except ValidationError as error:
            return faults_of(error, fields)
        return self._misfits(isinstance(fields["circuit"], Mapping | Block))[:MOST_FAULTS]

    @classmethod
    def parse(cls, specification: Mapping[str, Any]) -> "Sweep":
        """A sweep from plain data."""
        if not isinstance(specification, Mapping):
            raise SpecificationError([Fault("", "a specification is a table of fields")])
        if bad := [name for name in specification if not isinstance(name, str)]:
            raise SpecificationError([Fault(str(name), "field names are strings") for name in bad])
        return cls(**specification)

    @classmethod
    def read(cls, path: str | Path) -> "Sweep":
        """A sweep from a .toml or .json file. Raises OSError for a file that cannot be read."""
        path = Path(path)
        try:
            text = path.read_text(encoding="utf-8")
            data = json.loads(text) if path.suffix == ".json" else tomllib.loads(text)
        except ValueError as error:  # of the encoding, too
            raise SpecificationError([Fault("", f"{path.name} cannot be parsed: {error}")]) from None
        except RecursionError:
            raise SpecificationError([TOO_DEEP]) from None
        return cls.parse(data)

    @property
    def key(self) -> str:
        """SHA-256 of the canonical normal form; label, priority and owner are not part of it."""
        return self._key

    @cached_property
    def _key(self) -> str:
        return key_of(self.normalized())

    def canonical(self) -> str:
        """The normal form as RFC 8785 text."""
        return canonical(self.normalized())

    def normalized(self) -> dict[str, Any]:
        """Axes expanded, ``per_site`` resolved where there is one size, defaults omitted, observations sorted."""
        return {
            "circuit": [block.normal_form(self.stop.trajectories) for block in self.circuit],
            "observe": [_normal_observation(item) for item in self.observations],
            "stop": self._resolved_stop.normal_form(),
        }

    @cached_property
    def goal(self) -> Goal | None:
        """The derived quantity that decides when it is enough, with the name of its axis; None without one."""
        return resolved(self.stop.goal, self.circuit)

    @cached_property
    def _resolved_stop(self) -> Stop:
        point = self.goal if self.stop.critical_point is not None else None
        return self.stop if point is None else self.stop.model_copy(update={"critical_point": point})

    @cached_property
    def starting(self) -> frozenset[str]:
        """Keys of the ensembles sampled from the start; a search for a critical point places others later."""
        blocks = self.circuit if self.goal else ()
        written = {one.key for block in blocks for _, one in _expansion(block).ensembles}
        return frozenset(written or (point.ensemble.key for point in self.points))

    @cached_property
    def observations(self) -> tuple[NamedObservation, ...]:
        """Observations sorted by name."""
        named = (NamedObservation(_name(item), item.model_copy(update={"name": None})) for item in self.observe)
        return tuple(sorted(named, key=lambda item: item.name))

    @cached_property
    def points(self) -> tuple[Point, ...]:
        """Every ensemble once, in table order: blocks as written, fields in the family's order, values as written.

        A search for a critical point lists every ensemble it may place, the values of its axis in ascending order.
        """
        points: dict[str, Point] = {}
        for block, expansion in zip(self.circuit, self._expansions, strict=True):
            for _, ensemble in expansion.ensembles:
                points.setdefault(ensemble.key, Point(ensemble, block.trajectories or self.stop.trajectories))
        return tuple(points.values())

    @cached_property
    def _expansions(self) -> tuple[Expansion, ...]:
        return tuple(_expansion(block) for block in placed(self.circuit, self.goal))

    @cached_property
    def axes(self) -> tuple[str, ...]:
        """Fields and parameters that take more than one value; ``layers`` only where the others do not fix it."""
        ensembles = [point.ensemble for point in self.points]
        names = list(dict.fromkeys(name for ensemble in ensembles for name in ensemble.columns))
        several = [name for name in names if _varies(name, ensembles)]
        if "layers" in several and self._fixed_by(n for n in several if n != "layers"):
            several.remove("layers")
        families = {point.ensemble.family for point in self.points}
        return (*(("family",) if len(families) > 1 else ()), *several)

    def _fixed_by(self, names: Iterable[str]) -> bool:
        """Whether these fields tell all ensembles apart."""
        fields = ("family", *names)
        rows = {tuple({"family": p.ensemble.family, **p.ensemble.columns}.get(n) for n in fields) for p in self.points}
        return len(rows) == len(self.points)

    def _misfits(self, single: bool) -> list[Fault]:
        """Faults between fields, found once every field by itself is valid."""
        faults: list[Fault] = []
        self._check_circuits(single, faults)
        names: set[str] = set()
        for index, item in enumerate(self.observe):
            if _name(item) in names:
                faults.append(Fault(f"observe[{index}].name", f"{_name(item)!r} names another observation already"))
            names.add(_name(item))
        faults += self.stop.faults(names)
        return faults if faults or self.goal is None else self._goal_faults(self.goal)

    def _goal_faults(self, goal: Goal) -> list[Fault]:
        observed = next(item.observation for item in self.observations if item.name == goal.of)
        return goal_faults(goal, self.circuit, [point.ensemble for point in self.points], observed)

    def _check_circuits(self, single: bool, faults: list[Fault]) -> None:
        caps: dict[str, int] = {}
        shapes: set[tuple[Any, ...]] = set()
        for index, block in enumerate(self.circuit):
            path = "circuit" if single else f"circuit[{index}]"
            own: set[str] = set()
            faults += [Fault(path + where, message) for where, message in self._expansions[index].faults]
            for where, ensemble in self._expansions[index].ensembles:
                cap = block.trajectories or self.stop.trajectories
                if ensemble.key in own:
                    faults.append(_twice(ensemble, path))
                elif caps.setdefault(ensemble.key, cap) != cap:
                    faults.append(Fault(f"{path}.trajectories", "an earlier block gives the same ensemble another cap"))
                own.add(ensemble.key)
                shape = ensemble.shape
                if shape not in shapes:
                    shapes.add(shape)
                    self._check_observations(ensemble, path, where, faults)
                if len(faults) > MOST_FAULTS:
                    return

    def _check_observations(self, ensemble: Ensemble, path: str, size: str, faults: list[Fault]) -> None:
        """Faults of observations with the field of the circuit they do not fit; equal ones once."""
        for index, item in enumerate(self.observe):
            if misfit := item.fault(ensemble):
                field = blamed(misfit, item.quantity, ensemble, size.removeprefix("."))
                message = misfit[1] if field is None else f"{misfit[1]} ({path}.{field})"
                fault = Fault(f"observe[{index}].{misfit[0]}", message)
                if fault not in faults:
                    faults.append(fault)


def _expansion(block: Block) -> Expansion:
    faults: list[Fault] = []
    return Expansion(list(block.ensembles("", faults)), faults)


def _name(item: Observation) -> str:
    return item.name if item.name is not None else item.quantity


def _normal_observation(item: NamedObservation) -> dict[str, Any]:
    form = {field: value for field, value in item.observation.normal_form().items() if field != "revision"}
    return form if item.name == item.observation.quantity else form | {"name": item.name}


def _varies(name: str, ensembles: Sequence[Ensemble]) -> bool:
    """Whether those that can have a value there have several; a label that a circuit does not use is one of them."""
    label = any(name in ensemble.labels for ensemble in ensembles)
    able = (e for e in ensembles if name in e.columns or (label and e.family == LAYERED))
    return len({ensemble.columns.get(name) for ensemble in able}) > 1


def _twice(ensemble: Ensemble, path: str) -> Fault:
    if ensemble.labels:
        shown = ", ".join(f"{name} = {value}" for name, value in ensemble.labels.items())
        return Fault(f"{path}.parameters", f"an earlier combination of values gives the circuit of {shown} already")
    return Fault(f"{path}.layers", "two values give the same number of layers at one size")
