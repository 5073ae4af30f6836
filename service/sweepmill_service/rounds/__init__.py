"""Rounds of sampling for a goal: judged by pure functions, away from the dispatcher's thread."""
