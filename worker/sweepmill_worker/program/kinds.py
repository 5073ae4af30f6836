"""Kinds of random words of a step: a base plus the step's slot, its number within its layer."""

from typing import Final

PRIMARY: Final = 1
"""The gate of a step without rate; otherwise whether something happens; or which branch is taken."""
GATES: Final = 48
"""The gate of a step with a rate."""
OUTCOME: Final = 96
"""Outcomes, for engines that keep signs."""
PLACES: Final = 144
"""A stream: the places of a step that draws them."""
DISORDER: Final = 192
"""Plus the number of the quenched rate or weight in the whole circuit; in layer 0."""

SLOTS: Final = 47
"""Steps of a layer."""
DISORDERS: Final = 64

TRAJECTORY_LAYER: Final = 2**31
"""Plus the index of the list of layers: the layer of gates drawn once per trajectory, or once per ensemble."""
ENSEMBLE_TRAJECTORY: Final = 2**64 - 1
"""The number of the trajectory whose words the gates drawn once per ensemble use."""
