"""One trajectory recomputed on demand, within limits: it runs in a thread of the service, not in the pool."""

import threading
from collections.abc import Iterable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from http import HTTPStatus
from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.messages import CircuitFormat, CircuitText, Trajectory, TrajectoryValue
from sweepmill.observation import Observation, observation_from_normal_form
from sweepmill.revisions import QUANTITY_REVISIONS
from sweepmill_service.cost import Costs
from sweepmill_service.problems import Refusal, Unavailable
from sweepmill_service.settings import ServerLimits
from sweepmill_service.store import Store
from sweepmill_worker.circuit_text.write import TooLong, circuit_text
from sweepmill_worker.sample import trajectory_values, versions

_ONE_AT_A_TIME = threading.Lock()
_QUEUE = threading.BoundedSemaphore(4)  # who waits holds a thread that other requests need


@dataclass(frozen=True)
class Recomputable:
    """Trajectory ``k`` of an ensemble, with the observations stored of it, short enough to be recomputed here."""

    ensemble: Ensemble
    forms: tuple[dict[str, object], ...]
    k: int
    limits: ServerLimits

    @classmethod
    def find(cls, store: Store, key: str, k: int, limits: ServerLimits) -> "Recomputable":
        """Raises Refusal for an ensemble of which nothing is sampled, or predicted to take too long."""
        ensemble_form, forms = store.normal_forms(key)
        ensemble = Ensemble.from_normal_form(ensemble_form)
        if not forms:
            raise _refused(f"nothing is sampled of ensemble {key} yet, so there is no observation to recompute")
        seconds = Costs.of([ensemble], _current(forms.values()), store)[key].seconds
        if seconds > limits.recompute_seconds:
            raise _refused(
                f"this trajectory is predicted to take {seconds:.0f} s, the service recomputes up to "
                f"{limits.recompute_seconds:g} s (limits.recompute_seconds): use `sweepmill replay {key[:16]} {k}` "
                "instead"
            )
        return cls(ensemble, tuple(forms[name] for name in sorted(forms)), k, limits)

    def trajectory(self, language: CircuitFormat | None) -> Trajectory:
        """Values of all observations, and the circuit if a language is named.

        Raises Refusal for another revision or a circuit that is too long to write, Unavailable while others are being
        recomputed.
        """
        try:
            observations = [observation_from_normal_form(form) for form in self.forms]
            with _turn():
                circuit = None if language is None else CircuitText(format=language, text=self._text(language))
                values = trajectory_values(self.ensemble, observations, self.k)
        except ValueError as error:  # a revision this code no longer samples
            raise _refused(str(error)) from error
        return Trajectory(
            ensemble=self.ensemble.key,
            trajectory=self.k,
            parameters=dict(self.ensemble.parameters),
            observations=[TrajectoryValue.model_validate(item) for item in values],
            versions=versions(),
            circuit=circuit,
        )

    def circuit(self, language: CircuitFormat) -> str:
        """The text of the circuit alone. Raises like ``trajectory``."""
        try:
            with _turn():
                return self._text(language)
        except ValueError as error:  # a revision this code no longer samples
            raise _refused(str(error)) from error

    def _text(self, language: CircuitFormat) -> str:
        try:
            return circuit_text(self.ensemble, self.k, language, self.limits.circuit_operations)
        except TooLong as error:
            raise _refused(
                f"{error} (limits.circuit_operations): use `sweepmill replay {self.ensemble.key[:16]} {self.k} "
                f"--circuit {language}` instead"
            ) from error


def _current(forms: Iterable[Mapping[str, Any]]) -> list[Observation]:
    """Observations of revisions that this code samples: the others are refused later, by their revision."""
    known = (form for form in forms if QUANTITY_REVISIONS.get(form["quantity"]) == form["revision"])
    return [observation_from_normal_form(form) for form in known]


@contextmanager
def _turn() -> Iterator[None]:
    """One computes, a few wait. Raises Unavailable for the rest."""
    if not _QUEUE.acquire(blocking=False):
        raise Unavailable("several trajectories are being recomputed already")
    try:
        with _ONE_AT_A_TIME:
            yield
    finally:
        _QUEUE.release()


def _refused(detail: str) -> Refusal:
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, detail)
