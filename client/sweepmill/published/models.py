"""What is known of a published result: its sources, its values, and the fit that gives ours. No physics here."""

from typing import Annotated, Literal

from pydantic import BaseModel, ConfigDict, Field


class _Strict(BaseModel):
    model_config = ConfigDict(frozen=True, extra="forbid")


class Source(_Strict):
    """Where a value stands: title and place, such as journal, volume, page and arXiv number."""

    title: str
    place: str


class Known(_Strict):
    """One value that ours is compared with.

    `quantity` is the name that the fit gives it. `source` counts in the list of sources. `standing`: "exact", "read" in
    the source, from an independent "simulation", or from "memory". Ours is reproduced if it agrees where `decides`.
    """

    quantity: str
    value: float
    error: Annotated[float, Field(ge=0)] = 0.0
    written: str | None = None
    source: Annotated[int, Field(ge=0)]
    standing: Literal["exact", "read", "simulation", "memory"]
    decides: bool = False

    @property
    def text(self) -> str:
        """As written in the source, or the value with its error."""
        if self.written:
            return self.written
        return f"{self.value:.10g}" + (f" ± {self.error:g}" if self.error else "")


class Near(_Strict):
    """Points with |x - center| sites^power <= reach only, and only these sizes if some are named."""

    sizes: tuple[int, ...] = ()
    center: float = 0.0
    power: float = 0.0
    reach: Annotated[float, Field(gt=0)] | None = None
    at_least: float | None = None


class _OnPoints(_Strict):
    """A fit on points: observation `name` against the column `x`, or the observations of `places` against its values.

    `where` chooses rows by other columns; `quantities` gives names to what the fit calls otherwise.
    """

    name: str | None = None
    x: str = "sites"
    places: dict[str, float] = Field(default_factory=dict)
    where: dict[str, float | str] = Field(default_factory=dict)
    near: Near = Near()
    quantities: dict[str, str] = Field(default_factory=dict)


class CollapseFit(_OnPoints):
    """`fit_collapse` with a polynomial; `corrected`: with a correction L^-omega, omega free unless it is given."""

    kind: Literal["collapse"]
    degree: int = 3
    corrected: bool = False
    omega: float | None = None


class CrossingsFit(_OnPoints):
    """`fit_crossings`."""

    kind: Literal["crossings"]
    degree: int = 3
    power: float = 1.0


class LawFit(_OnPoints):
    """`fit_laws` among the named laws; the estimates are those of one law, and slopes by ln x between doublings.

    `threshold`: the law is one of the times at which curves over layers fall to it. `ring`: chords take its length.
    """

    kind: Literal["law"]
    among: Literal["entanglement", "growth", "decay", "times"]
    law: str
    ring: float | None = None
    threshold: float | None = None
    points: int | None = None
    slopes: bool = False


class RecordFit(_OnPoints):
    """`fit_central_charge` at a measurement rate."""

    kind: Literal["record"]
    rate: float


class Average(_Strict):
    """One average under the name `quantity`: the mean of a row of the table, or one over its exact histogram.

    `of`: "mean"; "purity", the mean of 2^-S; "share", how often the value is `value`. A row is an observation, its
    layer and the number of sites where there are several.
    """

    quantity: str
    of: Literal["mean", "purity", "share"]
    name: str
    layer: int | None = None
    sites: int | None = None
    value: int = 0


class AveragesFit(_Strict):
    """No fit: averages by themselves."""

    kind: Literal["averages"]
    averages: Annotated[tuple[Average, ...], Field(min_length=1)]


Fit = Annotated[CollapseFit | CrossingsFit | LawFit | RecordFit | AveragesFit, Field(discriminator="kind")]


class Published(_Strict):
    """A published result beside the specification that reproduces it.

    `seconds` is what it took on two cores, measured; `quick` the cap per ensemble for a first look.
    """

    title: str
    result: str
    sources: Annotated[tuple[Source, ...], Field(min_length=1)]
    known: Annotated[tuple[Known, ...], Field(min_length=1)]
    fits: Annotated[tuple[Fit, ...], Field(min_length=1)]
    seconds: Annotated[float, Field(gt=0)]
    quick: Annotated[int, Field(ge=64)]
    remark: str = ""

    @property
    def headline(self) -> str:
        """The first known value, for a list."""
        return f"{self.known[0].quantity} = {self.known[0].text}"
