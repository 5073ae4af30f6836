"""Alembic run from the code: no configuration file, the scripts travel with the package."""

from pathlib import Path

from alembic import command
from alembic.config import Config
from alembic.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import Connection, Engine, text

from sweepmill_service.database import writing

ADVISORY_LOCK = 0x53574545  # one migration at a time on a Postgres server's database


def migrate(engine: Engine) -> None:
    """Upgrade the schema to the newest revision, in one transaction under a lock."""
    with writing(engine).begin() as connection:
        if connection.dialect.name == "postgresql":
            connection.execute(text("SET LOCAL lock_timeout = '30s'"))
            connection.execute(text("SET LOCAL statement_timeout = '600s'"))
            connection.execute(text("SELECT pg_advisory_xact_lock(:key)"), {"key": ADVISORY_LOCK})
        command.upgrade(_configuration(connection), "head")


def schema_is_current(engine: Engine) -> bool:
    """Whether the database is at the newest revision of this code."""
    with engine.connect() as connection:
        current = set(MigrationContext.configure(connection).get_current_heads())
    return current == set(ScriptDirectory.from_config(_configuration(None)).get_heads())


def _configuration(connection: Connection | None) -> Config:
    configuration = Config()
    configuration.set_main_option("script_location", str(Path(__file__).parent).replace("%", "%%"))
    configuration.set_main_option("path_separator", "os")
    configuration.attributes["connection"] = connection
    return configuration
