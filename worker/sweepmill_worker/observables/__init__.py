"""From region entropies and outcome counts of an engine to the integers of each observation."""
