"""The tables: one schema for SQLite and Postgres. Times are seconds since 1970-01-01 UTC."""

from sqlalchemy import (
    BigInteger,
    Column,
    Double,
    ForeignKey,
    ForeignKeyConstraint,
    Identity,
    Index,
    Integer,
    LargeBinary,
    MetaData,
    String,
    Table,
    Text,
    UniqueConstraint,
)

NAMING = {
    "ix": "ix_%(table_name)s_%(column_0_N_name)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
    "pk": "pk_%(table_name)s",
}
metadata = MetaData(naming_convention=NAMING)

Key = String(64)  # SHA-256, lower-case hex

sweep = Table(
    "sweep",
    metadata,
    Column("key", Key, primary_key=True),
    Column("specification", Text, nullable=False),  # canonical JSON of the normal form
    Column("state", String(16), nullable=False),
    Column("reason", Text),
    Column("commit_counter", BigInteger, nullable=False),
    Column("families", Text, nullable=False),  # JSON list
    Column("axes", Text, nullable=False),  # JSON list
    Column("rules", Text, nullable=False),  # JSON list of {observation, below}
    Column("at_least", BigInteger, nullable=False),
    Column("budget", Double),  # core-seconds
    Column("goal", Text),  # JSON of the derived quantity that decides, null without one
    Column("answers", Text),  # JSON list: what the last round found, one for each group of ensembles
    Column("ensembles", Integer, nullable=False),  # those that are sampled: all, or those placed so far
    Column("settled", Integer, nullable=False),
    Column("trajectories_sampled", BigInteger, nullable=False),
    Column("trajectories_cap", BigInteger, nullable=False),
    Column("core_seconds", Double, nullable=False),
    Column("created_at", Double, nullable=False),
    Index(None, "created_at", "key"),
)

request = Table(
    "request",
    metadata,
    Column("sweep", Key, ForeignKey("sweep.key"), primary_key=True),
    Column("owner", String(64), primary_key=True),
    Column("label", Text),
    Column("priority", Integer, nullable=False),
    Column("at", Double, nullable=False),
    Column("core_seconds", Double, nullable=False),
    Index(None, "owner"),
)

# One row: grows with every submission, withdrawal and amendment, so that a dispatcher polls one number.
change = Table(
    "change",
    metadata,
    Column("id", Integer, primary_key=True, autoincrement=False),
    Column("counter", BigInteger, nullable=False),
)

ensemble = Table(
    "ensemble",
    metadata,
    Column("key", Key, primary_key=True),
    Column("family", String(64), nullable=False),
    Column("normal_form", Text, nullable=False),
    Column("revision", Integer, nullable=False),
    Column("seconds_per_trajectory", Double),  # smoothed, of the latest batches
    Column("core_seconds", Double, nullable=False),
    Column("stuck", Text),  # why it cannot proceed
    Column("stuck_kind", String(32)),
    Column("retried_at", Double),  # faults before this no longer count
)

observation = Table(
    "observation",
    metadata,
    Column("key", Key, primary_key=True),
    Column("normal_form", Text, nullable=False),
)

sweep_ensemble = Table(
    "sweep_ensemble",
    metadata,
    Column("sweep", Key, ForeignKey("sweep.key"), primary_key=True),
    Column("ensemble", Key, ForeignKey("ensemble.key"), primary_key=True),
    Column("ordinal", Integer, nullable=False),
    Column("cap", BigInteger, nullable=False),  # with a goal the N of the current round, 0 while not placed
    Column("most", BigInteger),  # with a goal the cap of the specification
    Column("judged", BigInteger, nullable=False),  # the last rung judged and not met
    Column("sampled", BigInteger, nullable=False),  # prefix over all observations, at most the cap
    Column("met_by", String(8)),
    Column("trajectories", BigInteger),  # frozen when settled, with its digest
    Column("digest", String(64)),
    Column("changed", BigInteger, nullable=False),  # commit counter of the sweep at the last change
    UniqueConstraint("sweep", "ordinal"),
    Index(None, "ensemble"),
)

sweep_observation = Table(
    "sweep_observation",
    metadata,
    Column("sweep", Key, ForeignKey("sweep.key"), primary_key=True),
    Column("name", String(200), primary_key=True),
    Column("ordinal", Integer, nullable=False),
    Column("observation", Key, ForeignKey("observation.key"), nullable=False),
)

# One row for each time the goal of a sweep was judged: what was known, what was found, what was decided.
round_ = Table(
    "round",
    metadata,
    Column("sweep", Key, ForeignKey("sweep.key"), primary_key=True),
    Column("number", Integer, primary_key=True, autoincrement=False),  # from 1
    Column("trajectories", BigInteger, nullable=False),
    Column("core_seconds", Double, nullable=False),  # charged to the sweep so far
    Column("answers", Text, nullable=False),  # JSON list
    Column("places", Text, nullable=False),  # JSON list of [ordinal, N judged, cost, N of the next round]
    Column("settled", Integer, nullable=False),  # 1 where the sweep settled with this round
    Column("at", Double, nullable=False),
)

total = Table(
    "total",
    metadata,
    Column("ensemble", Key, ForeignKey("ensemble.key"), primary_key=True),
    Column("observation", Key, ForeignKey("observation.key"), primary_key=True),
    Column("trajectories", BigInteger, nullable=False),  # the first N of them
    Column("accumulator", LargeBinary, nullable=False),
    Column("digest", String(64), nullable=False),
)

# Totals at an N where a rule of some sweep is or was judged: frozen tables are read from here.
mark = Table(
    "mark",
    metadata,
    Column("ensemble", Key, primary_key=True),
    Column("observation", Key, primary_key=True),
    Column("trajectories", BigInteger, primary_key=True),
    Column("accumulator", LargeBinary, nullable=False),
    Column("digest", String(64), nullable=False),
    ForeignKeyConstraint(["ensemble", "observation"], ["total.ensemble", "total.observation"]),
)

batch = Table(
    "batch",
    metadata,
    Column("ensemble", Key, ForeignKey("ensemble.key"), primary_key=True),
    Column("observation", Key, ForeignKey("observation.key"), primary_key=True),
    Column("first", BigInteger, primary_key=True, autoincrement=False),
    Column("count", BigInteger, nullable=False),
    Column("digest", String(64), nullable=False),
    Column("accumulator", LargeBinary),  # dropped once folded into the total
    Column("seconds", Double, nullable=False),  # CPU seconds, the observations of a task sharing them equally
    Column("worker", Text, nullable=False),
    Column("versions", Text, nullable=False),  # JSON
    Column("at", Double, nullable=False),
    Index(None, "ensemble", "at"),
)
Index(
    "ix_batch_unfolded",
    batch.c.ensemble,
    postgresql_where=batch.c.accumulator.is_not(None),
    sqlite_where=batch.c.accumulator.is_not(None),
)

# Values of every trajectory of a batch, of observations that keep them: written with the batch, never changed.
kept = Table(
    "kept",
    metadata,
    Column("ensemble", Key, primary_key=True),
    Column("observation", Key, primary_key=True),
    Column("first", BigInteger, primary_key=True, autoincrement=False),
    Column("digest", String(64), nullable=False),  # of the integers
    Column("data", LargeBinary, nullable=False),
    ForeignKeyConstraint(["ensemble", "observation", "first"], ["batch.ensemble", "batch.observation", "batch.first"]),
)

# Every task handed to the pool, written before it is handed over.
start = Table(
    "start",
    metadata,
    Column("id", BigInteger().with_variant(Integer, "sqlite"), Identity(), primary_key=True),
    Column("ensemble", Key, ForeignKey("ensemble.key"), nullable=False),
    Column("first", BigInteger, nullable=False),
    Column("count", BigInteger, nullable=False),
    Column("observations", Text, nullable=False),  # JSON list of keys
    Column("attempt", Integer, nullable=False),
    Column("sweep", Key, ForeignKey("sweep.key"), nullable=False),
    Column("owner", String(64), nullable=False),
    Column("run", String(32), nullable=False),  # the dispatcher's run
    Column("at", Double, nullable=False),
    Index(None, "ensemble"),
)

fault = Table(
    "fault",
    metadata,
    Column("ensemble", Key, ForeignKey("ensemble.key"), primary_key=True),
    Column("first", BigInteger, primary_key=True, autoincrement=False),
    Column("attempt", Integer, primary_key=True, autoincrement=False),
    Column("count", BigInteger, nullable=False),
    Column("kind", String(32), nullable=False),
    Column("message", Text, nullable=False),
    Column("traceback", Text, nullable=False),
    Column("worker", Text, nullable=False),
    Column("at", Double, nullable=False),
)
