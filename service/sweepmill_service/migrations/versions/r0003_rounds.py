"""Goals of sweeps, and the rounds in which they are judged."""

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.add_column("sweep", sa.Column("goal", sa.Text(), nullable=True))
    op.add_column("sweep", sa.Column("answers", sa.Text(), nullable=True))
    op.add_column("sweep_ensemble", sa.Column("most", sa.BigInteger(), nullable=True))
    op.create_table(
        "round",
        sa.Column("sweep", sa.String(length=64), nullable=False),
        sa.Column("number", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("trajectories", sa.BigInteger(), nullable=False),
        sa.Column("core_seconds", sa.Double(), nullable=False),
        sa.Column("answers", sa.Text(), nullable=False),
        sa.Column("places", sa.Text(), nullable=False),
        sa.Column("settled", sa.Integer(), nullable=False),
        sa.Column("at", sa.Double(), nullable=False),
        sa.ForeignKeyConstraint(["sweep"], ["sweep.key"], name=op.f("fk_round_sweep_sweep")),
        sa.PrimaryKeyConstraint("sweep", "number", name=op.f("pk_round")),
    )
