"""The migrated schema is the schema of the code."""

from alembic.autogenerate import compare_metadata
from alembic.migration import MigrationContext
from sqlalchemy import inspect

from support.databases import DatabaseMaker
from sweepmill_service.database import open_database
from sweepmill_service.migrations import migrate, schema_is_current
from sweepmill_service.schema import metadata


def test_migrating_an_empty_database_gives_exactly_the_schema_of_the_code(make_database: DatabaseMaker) -> None:
    with make_database(migrated=False) as url:
        engine = open_database(url)
        assert not schema_is_current(engine)
        migrate(engine)
        assert schema_is_current(engine)
        with engine.connect() as connection:
            context = MigrationContext.configure(connection, opts={"compare_type": True})
            assert compare_metadata(context, metadata) == []
        engine.dispose()


def test_migrating_twice_changes_nothing(make_database: DatabaseMaker) -> None:
    with make_database(migrated=False) as url:
        engine = open_database(url)
        migrate(engine)
        tables = inspect(engine).get_table_names()
        migrate(engine)
        assert inspect(engine).get_table_names() == tables
        engine.dispose()
