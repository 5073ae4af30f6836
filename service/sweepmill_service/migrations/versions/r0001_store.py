"""Sweeps, requests, ensembles, batches, totals, starts and faults."""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "change",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("counter", sa.BigInteger(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_change")),
    )
    op.create_table(
        "ensemble",
        sa.Column("key", sa.String(length=64), nullable=False),
        sa.Column("family", sa.String(length=64), nullable=False),
        sa.Column("normal_form", sa.Text(), nullable=False),
        sa.Column("revision", sa.Integer(), nullable=False),
        sa.Column("seconds_per_trajectory", sa.Double(), nullable=True),
        sa.Column("core_seconds", sa.Double(), nullable=False),
        sa.Column("stuck", sa.Text(), nullable=True),
        sa.Column("stuck_kind", sa.String(length=32), nullable=True),
        sa.Column("retried_at", sa.Double(), nullable=True),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_ensemble")),
    )
    op.create_table(
        "observation",
        sa.Column("key", sa.String(length=64), nullable=False),
        sa.Column("normal_form", sa.Text(), nullable=False),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_observation")),
    )
    op.create_table(
        "sweep",
        sa.Column("key", sa.String(length=64), nullable=False),
        sa.Column("specification", sa.Text(), nullable=False),
        sa.Column("state", sa.String(length=16), nullable=False),
        sa.Column("reason", sa.Text(), nullable=True),
        sa.Column("commit_counter", sa.BigInteger(), nullable=False),
        sa.Column("families", sa.Text(), nullable=False),
        sa.Column("axes", sa.Text(), nullable=False),
        sa.Column("rules", sa.Text(), nullable=False),
        sa.Column("at_least", sa.BigInteger(), nullable=False),
        sa.Column("budget", sa.Double(), nullable=True),
        sa.Column("ensembles", sa.Integer(), nullable=False),
        sa.Column("settled", sa.Integer(), nullable=False),
        sa.Column("trajectories_sampled", sa.BigInteger(), nullable=False),
        sa.Column("trajectories_cap", sa.BigInteger(), nullable=False),
        sa.Column("core_seconds", sa.Double(), nullable=False),
        sa.Column("created_at", sa.Double(), nullable=False),
        sa.PrimaryKeyConstraint("key", name=op.f("pk_sweep")),
    )
    op.create_index(op.f("ix_sweep_created_at_key"), "sweep", ["created_at", "key"], unique=False)
    op.create_table(
        "batch",
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("observation", sa.String(length=64), nullable=False),
        sa.Column("first", sa.BigInteger(), autoincrement=False, nullable=False),
        sa.Column("count", sa.BigInteger(), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("accumulator", sa.LargeBinary(), nullable=True),
        sa.Column("seconds", sa.Double(), nullable=False),
        sa.Column("worker", sa.Text(), nullable=False),
        sa.Column("versions", sa.Text(), nullable=False),
        sa.Column("at", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["ensemble"], ["ensemble.key"], name=op.f("fk_batch_ensemble_ensemble")),
        sa.ForeignKeyConstraint(["observation"], ["observation.key"], name=op.f("fk_batch_observation_observation")),
        sa.PrimaryKeyConstraint("ensemble", "observation", "first", name=op.f("pk_batch")),
    )
    op.create_index(op.f("ix_batch_ensemble_at"), "batch", ["ensemble", "at"], unique=False)
    op.create_index(
        "ix_batch_unfolded",
        "batch",
        ["ensemble"],
        unique=False,
        postgresql_where=sa.text("accumulator IS NOT NULL"),
        sqlite_where=sa.text("accumulator IS NOT NULL"),
    )
    op.create_table(
        "fault",
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("first", sa.BigInteger(), autoincrement=False, nullable=False),
        sa.Column("attempt", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("count", sa.BigInteger(), nullable=False),
        sa.Column("kind", sa.String(length=32), nullable=False),
        sa.Column("message", sa.Text(), nullable=False),
        sa.Column("traceback", sa.Text(), nullable=False),
        sa.Column("worker", sa.Text(), nullable=False),
        sa.Column("at", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["ensemble"], ["ensemble.key"], name=op.f("fk_fault_ensemble_ensemble")),
        sa.PrimaryKeyConstraint("ensemble", "first", "attempt", name=op.f("pk_fault")),
    )
    op.create_table(
        "request",
        sa.Column("sweep", sa.String(length=64), nullable=False),
        sa.Column("owner", sa.String(length=64), nullable=False),
        sa.Column("label", sa.Text(), nullable=True),
        sa.Column("priority", sa.Integer(), nullable=False),
        sa.Column("at", sa.Double(), nullable=False),
        sa.Column("core_seconds", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["sweep"], ["sweep.key"], name=op.f("fk_request_sweep_sweep")),
        sa.PrimaryKeyConstraint("sweep", "owner", name=op.f("pk_request")),
    )
    op.create_index(op.f("ix_request_owner"), "request", ["owner"], unique=False)
    op.create_table(
        "start",
        sa.Column(
            "id",
            sa.BigInteger().with_variant(sa.Integer(), "sqlite"),
            sa.Identity(always=False),
            nullable=False,
        ),
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("first", sa.BigInteger(), nullable=False),
        sa.Column("count", sa.BigInteger(), nullable=False),
        sa.Column("observations", sa.Text(), nullable=False),
        sa.Column("attempt", sa.Integer(), nullable=False),
        sa.Column("sweep", sa.String(length=64), nullable=False),
        sa.Column("owner", sa.String(length=64), nullable=False),
        sa.Column("run", sa.String(length=32), nullable=False),
        sa.Column("at", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["ensemble"], ["ensemble.key"], name=op.f("fk_start_ensemble_ensemble")),
        sa.ForeignKeyConstraint(["sweep"], ["sweep.key"], name=op.f("fk_start_sweep_sweep")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_start")),
    )
    op.create_index(op.f("ix_start_ensemble"), "start", ["ensemble"], unique=False)
    op.create_table(
        "sweep_ensemble",
        sa.Column("sweep", sa.String(length=64), nullable=False),
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("ordinal", sa.Integer(), nullable=False),
        sa.Column("cap", sa.BigInteger(), nullable=False),
        sa.Column("judged", sa.BigInteger(), nullable=False),
        sa.Column("sampled", sa.BigInteger(), nullable=False),
        sa.Column("met_by", sa.String(length=8), nullable=True),
        sa.Column("trajectories", sa.BigInteger(), nullable=True),
        sa.Column("digest", sa.String(length=64), nullable=True),
        sa.Column("changed", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(["ensemble"], ["ensemble.key"], name=op.f("fk_sweep_ensemble_ensemble_ensemble")),
        sa.ForeignKeyConstraint(["sweep"], ["sweep.key"], name=op.f("fk_sweep_ensemble_sweep_sweep")),
        sa.PrimaryKeyConstraint("sweep", "ensemble", name=op.f("pk_sweep_ensemble")),
        sa.UniqueConstraint("sweep", "ordinal", name=op.f("uq_sweep_ensemble_sweep_ordinal")),
    )
    op.create_index(op.f("ix_sweep_ensemble_ensemble"), "sweep_ensemble", ["ensemble"], unique=False)
    op.create_table(
        "sweep_observation",
        sa.Column("sweep", sa.String(length=64), nullable=False),
        sa.Column("name", sa.String(length=200), nullable=False),
        sa.Column("ordinal", sa.Integer(), nullable=False),
        sa.Column("observation", sa.String(length=64), nullable=False),
        sa.ForeignKeyConstraint(
            ["observation"], ["observation.key"], name=op.f("fk_sweep_observation_observation_observation")
        ),
        sa.ForeignKeyConstraint(["sweep"], ["sweep.key"], name=op.f("fk_sweep_observation_sweep_sweep")),
        sa.PrimaryKeyConstraint("sweep", "name", name=op.f("pk_sweep_observation")),
    )
    op.create_table(
        "total",
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("observation", sa.String(length=64), nullable=False),
        sa.Column("trajectories", sa.BigInteger(), nullable=False),
        sa.Column("accumulator", sa.LargeBinary(), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.ForeignKeyConstraint(["ensemble"], ["ensemble.key"], name=op.f("fk_total_ensemble_ensemble")),
        sa.ForeignKeyConstraint(["observation"], ["observation.key"], name=op.f("fk_total_observation_observation")),
        sa.PrimaryKeyConstraint("ensemble", "observation", name=op.f("pk_total")),
    )
    op.create_table(
        "mark",
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("observation", sa.String(length=64), nullable=False),
        sa.Column("trajectories", sa.BigInteger(), nullable=False),
        sa.Column("accumulator", sa.LargeBinary(), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.ForeignKeyConstraint(
            ["ensemble", "observation"],
            ["total.ensemble", "total.observation"],
            name=op.f("fk_mark_ensemble_observation_total"),
        ),
        sa.PrimaryKeyConstraint("ensemble", "observation", "trajectories", name=op.f("pk_mark")),
    )
    op.execute("INSERT INTO change (id, counter) VALUES (1, 0)")
