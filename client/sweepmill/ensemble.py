"""An ensemble: all trajectories of one circuit family with every parameter fixed."""

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from sweepmill.identity import key_of, key_words
from sweepmill.revisions import FAMILY_REVISIONS

# Parameters of each family in table order; a value is the default that a normal form omits, None means required.
FAMILY_PARAMETERS: dict[str, dict[str, int | float | str | None]] = {
    "hybrid-clifford": {
        "sites": None,
        "measurement_rate": None,
        "boundary": "periodic",
        "initial_state": "zeros",
        "layers": None,
        "replicate": 0,
    },
}


@dataclass(frozen=True)
class Ensemble:
    """Family and complete parameters (``sites``, ``layers`` … resolved to numbers).

    ``revision`` is the family revision its key was made with.
    """

    family: str
    parameters: Mapping[str, int | float | str]
    revision: int

    @classmethod
    def of(cls, family: str, **parameters: int | float | str) -> "Ensemble":
        """An ensemble of the current revision; omitted parameters take their defaults. Raises ValueError."""
        table = FAMILY_PARAMETERS.get(family)
        if table is None:
            raise ValueError(f"unknown circuit family {family!r}: one of {', '.join(sorted(FAMILY_PARAMETERS))}")
        if unknown := parameters.keys() - table.keys():
            raise ValueError(f"{family} has no parameter {', '.join(sorted(unknown))}")
        complete: dict[str, int | float | str] = {}
        for name, default in table.items():
            value = parameters.get(name, default)
            if value is None:
                raise ValueError(f"{family} needs the parameter {name}")
            complete[name] = value
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
        changed = {name: value for name, value in self.parameters.items() if value != table[name]}
        return {"family": self.family, "revision": self.revision, **changed}

    @cached_property
    def key(self) -> str:
        """SHA-256 of the canonical normal form."""
        return key_of(self.normal_form())

    @property
    def key_words(self) -> tuple[int, int]:
        """The two 32-bit words that seed the random words of every trajectory."""
        return key_words(self.key)

    @property
    def sites(self) -> int:
        """Number of sites L."""
        return int(self.parameters["sites"])

    @property
    def layers(self) -> int:
        """Number of layers T."""
        return int(self.parameters["layers"])

    @property
    def periodic(self) -> bool:
        """Whether site L-1 neighbours site 0."""
        return self.parameters["boundary"] == "periodic"

    @property
    def cell(self) -> int:
        """Layers of the unit cell in time: the brickwork repeats after two."""
        return 2

    @property
    def references(self) -> int:
        """Number of reference qubits, which no layer touches."""
        return 0

    @property
    def shape(self) -> tuple[str, str, int, int, int, int, bool]:
        """What decides which observations can be read off, and their coordinates."""
        engine = str(self.parameters.get("engine", "auto"))
        return self.family, engine, self.sites, self.references, self.layers, self.cell, self.periodic
