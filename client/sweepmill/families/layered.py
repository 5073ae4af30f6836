"""Circuits written as data."""

import re
from collections.abc import Iterator, Sequence
from functools import cached_property
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, Field

from sweepmill.axes import IntegerAxis, NumberAxis, located_values, nonempty
from sweepmill.ensemble import FAMILY_PARAMETERS, Ensemble
from sweepmill.errors import Fault
from sweepmill.families.block import Block, Values, column
from sweepmill.families.fields import BoundaryAxis, LayeredStateAxis, LayersAxis, PerSite, Title
from sweepmill.frozen import FrozenTable, freeze
from sweepmill.language.forms import Chain, Resolution, written_form
from sweepmill.language.frame import forced_faults
from sweepmill.language.grammar import grammar_faults, literal_faults
from sweepmill.language.program import Program, visits
from sweepmill.language.steps import LayerList, Measure

MOST_NOTED = 200  # faults of values, more than anybody is shown
_NAME = re.compile(r"[A-Za-z][A-Za-z0-9_]{0,63}")
TAKEN = frozenset(
    {
        *("family", "circuit", "trajectories", "parameters", "name", "quantity", "region", "layer", "position"),
        *("mean", "standard_error", "variance", "minimum", "maximum", "met_by", "value", "occurrences"),
        *("trajectory", "numerator", "denominator", "by_fold"),
        *FAMILY_PARAMETERS["layered"],
    }
)
"""Names that circuit fields and columns of tables have already."""


class Layered(Block):
    """A circuit as lists of steps: ``before`` once, ``repeat`` in turn for ``layers`` layers, ``after`` once.

    Rates may name ``parameters``, which may be axes. A ``name`` tells the circuits of several blocks apart, in the
    column ``circuit`` of the table.

    Layers are numbered from 1 through ``repeat`` to ``layers``, and on through ``after``: its first is layer
    ``layers`` + 1. Layers of ``before`` cannot be read; a profile by layer counts them from 1 on their own. Where
    ``after`` is not empty, unit cells that would reach into it are not read: ``at`` is "end", a list of layers, or a
    series of single layers. A place takes the value that a profile by site has at its first site.
    """

    family: Literal["layered"]
    sites: IntegerAxis
    boundary: BoundaryAxis = "periodic"
    initial_state: LayeredStateAxis = "zeros"
    layers: LayersAxis = PerSite(per_site=4)
    before: LayerList = ()
    repeat: Annotated[LayerList, AfterValidator(nonempty)]
    after: LayerList = ()
    parameters: dict[str, NumberAxis] = Field(default_factory=dict)
    name: Title | None = None

    def ensembles(self, path: str, faults: list[Fault]) -> Iterator[tuple[str, Ensemble]]:
        """Every valid ensemble of the block with the path to blame; faults found on the way are appended."""
        found = list(self._language_faults(path))
        if not found:
            yield from super().ensembles(path, faults)
            return
        self.columns(path, faults)  # its faults belong on the list, too
        faults.extend(dict.fromkeys([*found, *literal_faults(self.program, path)]))

    def _language_faults(self, path: str) -> Iterator[Fault]:
        """What is wrong with the circuit at every value of the parameters."""
        chains = self._chains()
        misplaced = [fault for chain in chains for fault in chain.place_faults(self.program, path)]
        yield from (*self._name_faults(path), *grammar_faults(self.program, self.parameters, path), *misplaced)

    @cached_property
    def program(self) -> Program:
        """The circuit as written."""
        return Program(self.before, self.repeat, self.after)

    def _chains(self) -> list[Chain]:
        """Every size with every boundary."""
        return [
            Chain(int(sites), boundary == "periodic")
            for _, sites in column(self.sites, "sites", "", [])
            for _, boundary in column(self.boundary, "boundary", "", [])
        ]

    def _name_faults(self, path: str) -> Iterator[Fault]:
        for name in self.parameters:
            where = f"{path}.parameters.{name}"
            if not _NAME.fullmatch(name):
                yield Fault(where, "a parameter is named by up to 64 letters, digits and underscores, a letter first")
            elif name in TAKEN:
                yield Fault(where, f"{name!r} is a field of a circuit or a column of a table: use another name")

    def columns(self, path: str, faults: list[Fault]) -> dict[str, Values]:
        """Fields and parameters, the parameters by name and before the layers."""
        fields = super().columns(path, faults)
        parameters = {
            name: column(axis, "", f"{path}.parameters.{name}", faults)
            for name, axis in sorted(self.parameters.items())
        }
        tail = {name: fields.pop(name) for name in ("layers", "replicate", "engine")}
        return fields | parameters | tail

    def ensemble(self, values: dict[str, Any], path: str, faults: list[Fault]) -> Ensemble | None:
        """The circuit at one size with its parameters resolved; None with faults where a value is out of range."""
        given = {name: values.pop(name) for name in sorted(self.parameters)}
        at = (int(values["sites"]), values["boundary"] == "periodic", *given.values())
        if at not in self._resolved:
            self._resolved[at] = self._resolve(Chain(*at[:2]), given, path, faults)
        program = self._resolved[at]
        if program is None or not self._possible(program, (*at, int(values["layers"])), path, faults):
            return None
        plain = Ensemble.of(self.family, **values, **program)
        named = {} if self.name is None else {"circuit": self.name}
        return Ensemble(plain.family, plain.parameters, plain.revision, FrozenTable(named | given))

    @cached_property
    def _resolved(self) -> dict[tuple[Any, ...], Any]:
        """Circuits that were resolved already, by size, boundary and values: other fields leave them as they are."""
        return {}

    def _resolve(self, chain: Chain, given: dict[str, float], path: str, faults: list[Fault]) -> Any:
        """The frozen circuit; None with faults where a value is out of range."""
        resolution = Resolution(chain, given)
        program = resolution.program(self.program, path)
        if not resolution.faults:
            return freeze(program)
        _note(resolution.faults, faults)
        return None

    def _possible(self, program: Any, at: tuple[Any, ...], path: str, faults: list[Fault]) -> bool:
        """Whether every outcome that the circuit forces has a chance; ``at`` is where it is resolved, layers last."""
        if not self._forces:
            return True
        if at not in self._forced:
            self._forced[at] = forced_faults(program, at[0], at[1], at[-1], path)
        _note(self._forced[at], faults)
        return not self._forced[at]

    @cached_property
    def _forces(self) -> bool:
        return any(isinstance(visit.step, Measure) and visit.step.forced for visit in visits(self.program, ""))

    @cached_property
    def _forced(self) -> dict[tuple[Any, ...], tuple[Fault, ...]]:
        """Faults of forced steps, by size, boundary, values and layers."""
        return {}

    def normal_form(self, cap: int) -> dict[str, Any]:
        """The block with its circuit as written, synonyms folded, and the values of its parameters."""
        parameters = {name: [value for _, value in located_values(axis, "")] for name, axis in self.parameters.items()}
        written = {part: written_form(layers) for part, layers in self.program._asdict().items() if layers}
        given = {name: values[0] if len(values) == 1 else values for name, values in parameters.items()}
        called = {} if self.name is None else {"name": self.name}
        return super().normal_form(cap) | called | written | ({"parameters": given} if given else {})


def _note(found: Sequence[Fault], faults: list[Fault]) -> None:
    if len(faults) < MOST_NOTED:
        faults.extend(fault for fault in dict.fromkeys(found) if fault not in faults)
