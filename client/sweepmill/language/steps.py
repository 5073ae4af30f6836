"""Steps as written: one action each, on places, with a rate."""

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, Discriminator, Tag

from sweepmill.axes import Flag, nonempty
from sweepmill.language.gates import canonical_gate
from sweepmill.language.numbers import Part, Rate
from sweepmill.language.places import WIDEST_PLACE, On
from sweepmill.language.refusal import keys_of, near, refuse, shown
from sweepmill.language.tags import STEPS

FEEDBACK = ("if", "when", "unless", "feedback", "condition", "conditional", "then", "else")
_SPELLINGS = {"depolarize": "depolarise", "swap-in": "swap_in"}


def _gate(value: Any) -> str:
    try:
        return canonical_gate(value)
    except ValueError as error:
        refuse(str(error))


def _product(value: Any) -> str:
    letters = value.strip().upper() if isinstance(value, str) else ""
    if not letters or set(letters) - set("XYZ"):
        refuse(f"must be a product of the letters X, Y and Z, one for each site of a place, got {shown(value)}")
    if len(letters) > WIDEST_PLACE:
        refuse(f"a product has at most {WIDEST_PLACE} sites, got {len(letters)}")
    return letters


class Apply(Part):
    """A Clifford gate: random per place and layer, random but fixed, or definite."""

    apply: Annotated[str, BeforeValidator(_gate)]
    on: On | None = None
    rate: Rate = 1
    fixed: Literal["trajectory", "ensemble"] | None = None
    rotated: Flag = False


class Measure(Part):
    """A Pauli product; ``recorded = false`` is dephasing, ``forced = true`` conditions on a possible outcome.

    Later outcomes, and the probability of the record, are conditional on the forced ones, which are not counted.
    """

    measure: Annotated[str, BeforeValidator(_product)]
    on: On | None = None
    rate: Rate = 1
    recorded: Flag = True
    forced: Flag = False


def _true(value: Any) -> Any:
    if value is not True:
        refuse(f"must be true, got {shown(value)}")
    return value


Yes = Annotated[Literal[True], BeforeValidator(_true)]


class Depolarise(Part):
    """Every site of a place becomes maximally mixed."""

    depolarise: Yes
    on: On | None = None
    rate: Rate = 1


class Reset(Part):
    """Every site of a place is traced out, then |0>."""

    reset: Yes
    on: On | None = None
    rate: Rate = 1


class SwapIn(Part):
    """The site becomes half of a fresh Bell pair, whose other half is a new reference qubit."""

    swap_in: Literal["reference"]
    on: On | None = None


class Branch(Part):
    """One of several exclusive alternatives at a place."""

    weight: Rate
    steps: "Steps"


class Choose(Part):
    """One branch per place, drawn with the weights."""

    choose: Annotated["Branches", AfterValidator(nonempty)]
    on: On | None = None


def _known_step(value: Any) -> Any:
    """One spelling of the actions; refuse feedback, and what is not exactly one action."""
    if isinstance(value, BaseModel):
        return value
    if not isinstance(value, Mapping):
        refuse(f'a step is a table such as {{ measure = "Z", on = "sites" }}, got {shown(value)}')
    if words := [name for name in value if str(name).lower() in FEEDBACK]:
        refuse(
            f"{words[0]!r}: no step can depend on earlier outcomes, because the states are kept without signs "
            "and so without the outcomes"
        )
    table = {_SPELLINGS.get(name, name): inner for name, inner in value.items()}
    actions = [name for name in table if name in STEPS]
    if len(actions) != 1:
        missed = next((near(str(n), STEPS) for n in table if n not in STEPS and near(str(n), STEPS)), "")
        found = " and ".join(actions) or ", ".join(map(str, table)) or "nothing"
        refuse(f"a step has exactly one of {', '.join(STEPS)}, got {found}{missed}")
    return table


def _step_tag(value: Any) -> str | None:
    return next((tag for name, tag in STEPS.items() if name in keys_of(value)), None)


Step = Annotated[
    Annotated[Apply, Tag(STEPS["apply"])]
    | Annotated[Measure, Tag(STEPS["measure"])]
    | Annotated[Depolarise, Tag(STEPS["depolarise"])]
    | Annotated[Reset, Tag(STEPS["reset"])]
    | Annotated[SwapIn, Tag(STEPS["swap_in"])]
    | Annotated[Choose, Tag(STEPS["choose"])],
    Discriminator(_step_tag),
    BeforeValidator(_known_step),
]


def _layer(value: Any) -> Any:
    if isinstance(value, Mapping | BaseModel):
        refuse("a layer is a list of steps: write repeat = [[ … ]]")
    return _listed(value)


def _listed(value: Any) -> Any:
    if not isinstance(value, list | tuple):
        refuse(f"must be a list, got {shown(value)}")
    return tuple(value)


Branches = Annotated[tuple[Branch, ...], BeforeValidator(_listed)]
Steps = Annotated[tuple[Step, ...], BeforeValidator(_listed)]
Layer = Annotated[tuple[Step, ...], BeforeValidator(_layer)]
LayerList = Annotated[tuple[Layer, ...], BeforeValidator(_listed)]
Branch.model_rebuild()
Choose.model_rebuild()
