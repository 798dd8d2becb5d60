"""Runs the migrations on the connection that labbook hands over, or on the URL given to the alembic command."""

from alembic import context
from sqlalchemy import text

from labbook.book.opening import engine_for
from labbook.book.stored_view import VIEW_NAME
from labbook.book.tables import metadata
from labbook.errors import BookProblem


def facts_only(obj, name, type_, reflected, compare_to):
    """The stored view is built from the registry, not migrated."""
    table = name if type_ == "table" else getattr(getattr(obj, "table", None), "name", None)
    return table != VIEW_NAME


def _foreign_keys(connection, switch: str) -> None:
    # on the driver itself: SQLAlchemy would begin a transaction first, and inside one the pragma does nothing
    connection.connection.dbapi_connection.execute(f"PRAGMA foreign_keys={switch}")


def migrate(connection) -> None:
    sqlite = connection.dialect.name == "sqlite"
    if sqlite:
        # a batch rebuild drops tables: with foreign keys on, it would break or empty their children
        _foreign_keys(connection, "OFF")
    context.configure(
        connection=connection,
        target_metadata=metadata,
        render_as_batch=sqlite,
        include_object=facts_only,
        compare_type=True,
        # labbook's engine begins transactions itself, and then SQLite takes a failed migration back whole
        transactional_ddl=True,
    )
    with context.begin_transaction():
        context.run_migrations()
        if sqlite:
            broken = connection.execute(text("PRAGMA foreign_key_check")).fetchall()
            if broken:
                raise BookProblem(
                    f"migrating would leave {len(broken)} rows without what they refer to: nothing was changed."
                )
    if sqlite:
        connection.commit()
        _foreign_keys(connection, "ON")


given = context.config.attributes.get("connection")
if given is not None:
    migrate(given)
else:
    engine = engine_for(context.config.get_main_option("sqlalchemy.url"))
    with engine.connect() as connection:
        migrate(connection)
    engine.dispose()
