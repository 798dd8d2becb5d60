"""Runs the migrations on the connection that labbook hands over, or on the URL given to the alembic command."""

from alembic import context
from sqlalchemy import create_engine, text

from labbook.book.stored_view import VIEW_NAME
from labbook.book.tables import metadata


def facts_only(obj, name, type_, reflected, compare_to):
    """The stored view is built from the registry, not migrated."""
    table = name if type_ == "table" else getattr(getattr(obj, "table", None), "name", None)
    return table != VIEW_NAME


def migrate(connection) -> None:
    sqlite = connection.dialect.name == "sqlite"
    if sqlite:
        # a batch rebuild drops tables: with foreign keys on, a cascade would empty their children
        connection.execute(text("PRAGMA foreign_keys=OFF"))
        connection.commit()
    context.configure(
        connection=connection,
        target_metadata=metadata,
        render_as_batch=sqlite,
        include_object=facts_only,
        compare_type=True,
    )
    with context.begin_transaction():
        context.run_migrations()
        if sqlite:
            broken = connection.execute(text("PRAGMA foreign_key_check")).fetchall()
            if broken:
                raise RuntimeError(f"the migration would break {len(broken)} foreign keys")
    if sqlite:
        connection.commit()
        connection.execute(text("PRAGMA foreign_keys=ON"))
        connection.commit()


given = context.config.attributes.get("connection")
if given is not None:
    migrate(given)
else:
    engine = create_engine(context.config.get_main_option("sqlalchemy.url"))
    with engine.connect() as connection:
        migrate(connection)
    engine.dispose()
