"""Bringing a database to the current schema. Forward only: take a backup before a new release."""

from sweepmill_service.migrations.run import migrate, schema_is_current

__all__ = ["migrate", "schema_is_current"]
