"""Names of union members of the language: pydantic puts them into locations, a reader never wrote them."""

NUMBER, PARAMETER = "form-number", "form-parameter"
PROFILES = {name: f"profile-{name}" for name in ("list", "stripe", "quasi-periodic")}
DISORDERS = {name: f"disorder-{name}" for name in ("uniform", "two-valued", "power-law")}
WORD = "on-word"
PLACES = {name: f"on-{name}" for name in ("blocks", "sublattice", "places", "random_pairs", "random_sequential")}
STEPS = {name: f"step-{name}" for name in ("apply", "measure", "depolarise", "reset", "swap_in", "choose")}
COUNT = {name: f"count-{name}" for name in ("word", "number", "per_site")}

LANGUAGE_TAGS = frozenset(
    {
        NUMBER,
        PARAMETER,
        WORD,
        *PROFILES.values(),
        *DISORDERS.values(),
        *PLACES.values(),
        *STEPS.values(),
        *COUNT.values(),
    }
)
