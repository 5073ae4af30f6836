"""Values of single trajectories, by batch."""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "kept",
        sa.Column("ensemble", sa.String(length=64), nullable=False),
        sa.Column("observation", sa.String(length=64), nullable=False),
        sa.Column("first", sa.BigInteger(), autoincrement=False, nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("data", sa.LargeBinary(), nullable=False),
        sa.ForeignKeyConstraint(
            ["ensemble", "observation", "first"],
            ["batch.ensemble", "batch.observation", "batch.first"],
            name=op.f("fk_kept_ensemble_observation_first_batch"),
        ),
        sa.PrimaryKeyConstraint("ensemble", "observation", "first", name=op.f("pk_kept")),
    )
