"""Ensemble averages over monitored quantum circuits, sampled once, to a chosen error bar, reproducible bit for bit.

from sweepmill import Client, Sweep

client = Client("http://127.0.0.1:8765")
sweep = client.submit(Sweep.read("transition.toml"))
sweep.wait()
table = sweep.table()
"""

from sweepmill.client import Client
from sweepmill.ensemble import Ensemble
from sweepmill.errors import (
    AccumulatorMismatch,
    AccumulatorOverflow,
    AmbiguousKey,
    BadSettings,
    Fault,
    KeyMismatch,
    MissingExtra,
    NotAKey,
    NotAllowed,
    ServiceError,
    SharedTrajectories,
    SpecificationError,
    SweepmillError,
    SweepStuck,
    SweepWithdrawn,
    TimedOut,
    Unavailable,
    UnexpectedAnswer,
    UnknownKey,
    Unreachable,
    WaitTimeout,
)
from sweepmill.folds import Folds
from sweepmill.presets import layered_form
from sweepmill.remote import RemoteSweep
from sweepmill.retry import Retry
from sweepmill.sweep import Sweep
from sweepmill.table import Table, require_independent
from sweepmill.values import Values

__all__ = [
    "AccumulatorMismatch",
    "AccumulatorOverflow",
    "AmbiguousKey",
    "BadSettings",
    "Client",
    "Ensemble",
    "Fault",
    "Folds",
    "KeyMismatch",
    "MissingExtra",
    "NotAKey",
    "NotAllowed",
    "RemoteSweep",
    "Retry",
    "ServiceError",
    "SharedTrajectories",
    "SpecificationError",
    "Sweep",
    "SweepStuck",
    "SweepWithdrawn",
    "SweepmillError",
    "Table",
    "TimedOut",
    "Unavailable",
    "UnexpectedAnswer",
    "UnknownKey",
    "Unreachable",
    "Values",
    "WaitTimeout",
    "layered_form",
    "require_independent",
]
