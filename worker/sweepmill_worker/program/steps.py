"""Steps as rows of a table, in depth-first order."""

from collections.abc import Mapping, Sequence
from fractions import Fraction
from typing import Any

from sweepmill_worker.program import kinds
from sweepmill_worker.program import tables as t
from sweepmill_worker.program.gates import bell_class, named_gate, random_classes
from sweepmill_worker.program.layout import Segments
from sweepmill_worker.program.operations import (
    DEPOLARISE,
    FORCED,
    GATE,
    MEASURE,
    RECORDED,
    RESET,
    SWAP_IN,
    WIDEST,
)
from sweepmill_worker.program.places import Places, Where, where
from sweepmill_worker.program.rates import PROBABILITY, WEIGHT, Levels, largest
from sweepmill_worker.program.roads import road

Step = Mapping[str, Any]
Row = list[int]


class Steps:
    """The steps of a whole circuit."""

    def __init__(self, sites: int, periodic: bool) -> None:
        self.sites, self.periodic = sites, periodic
        self.levels = Levels(sites)
        self.rows: list[Row] = []
        self.wheres: list[Where] = []
        """Per step."""
        self.branches: list[Row] = []
        self.children: dict[int, list[list[int]]] = {}
        self.tops: list[list[int]] = []
        self.segments: list[Segments] = []
        """Words of each list of layers."""
        self.once = {"trajectory": Segments(), "ensemble": Segments()}
        self.places: list[tuple[int, ...]] = []
        self.known: dict[Places, int] = {}
        self.laws: list[Fraction] = []
        self.classes: list[int] = []
        self.class_tables: dict[tuple[str, int], int] = {}
        self.references = 0
        self.layers = 0

    def add_layer(self, steps: Sequence[Step], layers: int) -> None:
        """One list of steps; `layers`: how many layers count on from the first one of its part of the circuit."""
        self.segments.append(Segments())
        self.layers, begin = layers, len(self.rows)
        tops = [self._add(step, begin, None) for step in steps]
        if len(self.rows) - begin > kinds.SLOTS:
            raise ValueError(f"a layer has at most {kinds.SLOTS} steps, got {len(self.rows) - begin}")
        for top in tops:
            self._link(top, -1)
            row = self.rows[top]
            row[t.ROAD], row[t.PARITY] = road(row, self.wheres[top], self.sites, self.periodic)
        self.tops.append(tops)

    def most_operations(self, tops: Sequence[int]) -> int:
        """How many rows the steps can give at most."""
        return sum(self.rows[top][t.PLACES] * self._size(top) for top in tops)

    def _size(self, step: int) -> int:
        if step in self.children:
            return max(sum(map(self._size, branch)) for branch in self.children[step])
        return 3 if self.rows[step][t.ROTATED] else 1

    def _add(self, step: Step, begin: int, parent: int | None) -> int:
        number, row = len(self.rows), [0] * t.STEP_COLUMNS
        self.rows.append(row)
        self.wheres.append(where(step["on"], self.sites, self.periodic) if parent is None else self.wheres[parent])
        row[t.SLOT] = number - begin
        if parent is None:
            self._place(row, self.wheres[number])
        else:
            for column in (t.WIDTH, t.FIRST, t.PLACES):
                row[column] = self.rows[parent][column]
        if "choose" in step:
            self._choose(number, row, step["choose"], begin)
        elif "apply" in step:
            self._apply(row, step)
        else:
            self._act(row, step)
        return number

    def _place(self, row: Row, at: Where) -> None:
        row[t.WIDTH], row[t.PLACES], row[t.STREAM] = at.width, at.count, at.stream
        if at.stream == t.NO_STREAM:
            row[t.FIRST] = self._listed(at.fixed)
            return
        row[t.FIRST] = len(self.places)
        self.places += [(0,)] * at.count  # rows of its own, rewritten whenever they are drawn
        if at.stream == t.SEQUENCE:
            row[t.STREAM_AT], row[t.STREAM_FROM] = self._listed(at.source), len(at.source)
        elif at.exponent == 0:
            row[t.STREAM_AT] = -1
        else:
            if at.exponent not in self.laws:
                self.laws.append(at.exponent)
            row[t.STREAM_AT] = self.laws.index(at.exponent)

    def _listed(self, places: Places) -> int:
        if places not in self.known:
            self.known[places] = len(self.places)
            self.places += places
        return self.known[places]

    def _choose(self, number: int, row: Row, branches: Sequence[Mapping[str, Any]], begin: int) -> None:
        row[t.CODE], row[t.BRANCHES_AT], row[t.BRANCHES] = t.CHOOSE, len(self.branches), len(branches)
        top = max(largest(branch["weight"]) for branch in branches)
        if top <= 0:
            raise ValueError("choose: weights have a positive sum")
        mine: list[Row] = [[] for _ in branches]
        self.branches += mine
        if len(branches) > 1:
            row[t.PRIMARY_AT] = self.segments[-1].add(kinds.PRIMARY + row[t.SLOT], row[t.PLACES])
        self.children[number] = []
        for branch, target in zip(branches, mine, strict=True):
            target += [*self._rate(branch["weight"], row, WEIGHT / top), -1]
            self.children[number].append([self._add(step, begin, number) for step in branch["steps"]])

    def _link(self, step: int, follow: int) -> None:
        """Which step is next for a place, resolved through the ends of branches."""
        self.rows[step][t.FOLLOW] = follow
        for ordinal, branch in enumerate(self.children.get(step, [])):
            chain = [*branch, follow]
            self.branches[self.rows[step][t.BRANCHES_AT] + ordinal][t.START] = chain[0]
            for this, following in zip(branch, chain[1:], strict=True):
                self._link(this, following)

    def _rate(self, spec: Any, row: Row, scale: Fraction) -> tuple[int, int, int]:
        found = self.levels.add(spec, scale, row[t.PLACES], self.layers)
        if found[0] == t.BY_DISORDER:
            number = len(self.levels.disorder) - 1
            if number >= kinds.DISORDERS:
                raise ValueError(f"a circuit has at most {kinds.DISORDERS} disordered rates and weights")
            at = self.once["trajectory"].add(kinds.DISORDER + number, row[t.PLACES])
            self.levels.disorder[number][t.WORDS_AT] = at
        return found

    def _happens(self, row: Row, step: Step) -> None:
        row[t.RATE_MODE], row[t.RATE_AT], row[t.RATE_PERIOD] = self._rate(step.get("rate", 1), row, PROBABILITY)
        if row[t.RATE_MODE] != t.ALWAYS:
            row[t.PRIMARY_AT] = self.segments[-1].add(kinds.PRIMARY + row[t.SLOT], row[t.PLACES])

    def _apply(self, row: Row, step: Step) -> None:
        row[t.CODE], row[t.ROTATED] = GATE, int(bool(step.get("rotated", False)))
        self._happens(row, step)
        if not row[t.PLACES]:  # nor a number of sites that could fit the gate
            return
        name, width = step["apply"], row[t.WIDTH]
        classes = random_classes(name, width)
        if row[t.ROTATED] and (classes is None or width != 2):
            raise ValueError(f"rotated: only a random gate on two sites is rotated, got {name}")
        if classes is None:
            number, frame = named_gate(name, width)
            row[t.DETAIL] = 16 * number + frame
            return
        if (name, width) not in self.class_tables:
            self.class_tables[name, width] = len(self.classes)
            self.classes += classes.tolist()
        row[t.CLASSES_AT], row[t.CLASSES] = self.class_tables[name, width], len(classes)
        self._gate_words(row, step.get("fixed"))

    def _gate_words(self, row: Row, fixed: str | None) -> None:
        kind = row[t.SLOT] + (kinds.PRIMARY if row[t.RATE_MODE] == t.ALWAYS else kinds.GATES)
        if fixed is None:
            row[t.GATE_AT] = self.segments[-1].add(kind, row[t.PLACES])
            return
        row[t.FIXED] = 1 if fixed == "trajectory" else 2
        layer = kinds.TRAJECTORY_LAYER + len(self.segments) - 1
        row[t.GATE_AT] = self.once[fixed].add(kind, row[t.PLACES], layer)

    def _act(self, row: Row, step: Step) -> None:
        if row[t.WIDTH] > WIDEST:
            raise ValueError(f"a place has at most {WIDEST} sites, got {row[t.WIDTH]}")
        if "measure" in step:
            row[t.CODE], letters = MEASURE, step["measure"]
            if (row[t.PLACES] and len(letters) != row[t.WIDTH]) or set(letters) - set("XYZ"):
                raise ValueError(f"measure: one letter X, Y or Z for each of {row[t.WIDTH]} sites, got {letters}")
            row[t.DETAIL] = int(letters.translate(str.maketrans("XYZ", "123")), 4)
            row[t.FLAGS] = RECORDED * step.get("recorded", True) + FORCED * step.get("forced", False)
        elif "depolarise" in step:
            row[t.CODE] = DEPOLARISE
        elif "reset" in step:
            row[t.CODE] = RESET
        elif "swap_in" in step:
            if row[t.WIDTH] != 1:
                raise ValueError(f"swap_in: places have one site, got {row[t.WIDTH]}")
            row[t.CODE], row[t.REFERENCE] = SWAP_IN, self.sites + self.references
            row[t.DETAIL] = bell_class()
            self.references += row[t.PLACES]
        else:
            raise ValueError(f"a step applies, measures, depolarises, resets, swaps in or chooses, got {dict(step)}")
        self._happens(row, step)
