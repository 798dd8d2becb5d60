"""The facts: tables of the shelf, the readings, the runs and the ledger, as Alembic migrates them."""

from sqlalchemy import (
    JSON,
    Boolean,
    CheckConstraint,
    Column,
    ForeignKey,
    Integer,
    LargeBinary,
    MetaData,
    String,
    Table,
    Text,
    UniqueConstraint,
)  # fmt: skip

NAMING = {
    "ix": "ix_%(table_name)s_%(column_0_N_name)s",
    "uq": "uq_%(table_name)s_%(column_0_N_name)s",
    "ck": "ck_%(table_name)s_%(constraint_name)s",
    "fk": "fk_%(table_name)s_%(column_0_N_name)s",
    "pk": "pk_%(table_name)s",
}

metadata = MetaData(naming_convention=NAMING)


def _code():
    return Column("code", String(64), nullable=False, unique=True)


def _typed():
    # key -> [text, unit, SI value, standard uncertainty, origin]: what was typed, beside what it means
    return Column("typed", JSON, nullable=False)


book = Table(
    "book",
    metadata,
    Column("id", Integer, primary_key=True),
    Column("made", String(32), nullable=False),
    # fingerprint of the registry that the stored view was built from
    Column("registry", String(64), nullable=False),
)

material = Table(
    "material",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("kind", String(64)),
    _typed(),
    Column("made", String(10)),
    Column("note", Text),
    Column("retired", Boolean, nullable=False),
)

fluid = Table(
    "fluid",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("kind", String(64), nullable=False),
    _typed(),
    Column("made", String(10)),
    Column("note", Text),
    Column("retired", Boolean, nullable=False),
)

reading = Table(
    "reading",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("fluid_id", ForeignKey("fluid.id"), index=True),
    Column("material_id", ForeignKey("material.id"), index=True),
    Column("key", String(16), nullable=False),
    _typed(),
    Column("on", String(10)),
    Column("how", Text),
    Column("note", Text),
    Column("state", String(8), nullable=False),
    Column("why", Text),
    Column("sheet_row", String(80), unique=True),
    CheckConstraint("(fluid_id IS NULL) <> (material_id IS NULL)", name="of_one"),
)

swimmer = Table(
    "swimmer",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("form", String(32), nullable=False),
    Column("material_id", ForeignKey("material.id"), index=True),
    Column("section", String(8)),
    Column("parent_id", ForeignKey("swimmer.id"), index=True),
    _typed(),
    Column("built", String(10)),
    Column("note", Text),
    Column("retired", Boolean, nullable=False),
)

rig = Table(
    "rig",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("kind", String(64)),
    _typed(),
    Column("calibrated", String(10)),
    Column("note", Text),
    Column("retired", Boolean, nullable=False),
)

run = Table(
    "run",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("serial", Integer, index=True),  # the 12 of R-0012, for the next free code
    Column("swimmer_id", ForeignKey("swimmer.id"), nullable=False, index=True),
    Column("fluid_id", ForeignKey("fluid.id"), nullable=False, index=True),
    Column("rig_id", ForeignKey("rig.id"), index=True),
    Column("at", String(20), nullable=False),  # UTC, ISO 8601, ends in Z
    Column("by", String(64), nullable=False, index=True),
    Column("drive", String(32), nullable=False),
    Column("series", String(128), index=True),
    Column("video", Text),
    Column("note", Text),
    Column("state", String(8), nullable=False),
    Column("why", Text),
    _typed(),
    Column("confirmed", Text),  # the warnings that were confirmed, one a line
    Column("logged", String(20), nullable=False),
    Column("token", String(64), unique=True),  # one-use token of the form
    Column("sheet_row", String(80), unique=True),  # digest of a sheet's row and which equal row it was
    CheckConstraint("state IN ('kept', 'void')", name="state"),
)

ledger = Table(
    "ledger",
    metadata,
    Column("id", Integer, primary_key=True),
    Column("at", String(20), nullable=False),
    Column("by", String(64), nullable=False, index=True),
    Column("act", String(16), nullable=False),
    Column("kind", String(16), nullable=False),
    Column("subject", String(128), nullable=False, index=True),
    Column("before", Text),
    Column("after", Text),
    Column("why", Text),
    Column("runs", Text),  # codes of the runs that the act wrote or derived again, as ranges
    Column("previous", String(64), nullable=False),
    Column("digest", String(64), nullable=False),
)

ledger_run = Table(
    "ledger_run",
    metadata,
    Column("run_id", ForeignKey("run.id"), primary_key=True),
    Column("ledger_id", ForeignKey("ledger.id"), primary_key=True),
)

# the group's own registry: each change is a new version, the old ones stay
registry_row = Table(
    "registry_row",
    metadata,
    Column("id", Integer, primary_key=True),
    Column("kind", String(16), nullable=False),  # number, regime, house
    Column("key", String(64), nullable=False),
    Column("version", Integer, nullable=False),
    Column("content", JSON(none_as_null=True)),  # NULL: withdrawn
    Column("at", String(20), nullable=False),
    Column("by", String(64), nullable=False),
    Column("why", Text),
    UniqueConstraint("kind", "key", "version"),
)

# points that others printed: drawn beside the runs, never counted among them
published = Table(
    "published",
    metadata,
    Column("id", Integer, primary_key=True),
    Column("series", String(64), nullable=False, index=True),
    Column("citation", Text, nullable=False),
    Column("x", String(24), nullable=False),
    Column("x_dialect", Text),
    Column("y", String(24), nullable=False),
    Column("y_dialect", Text),
    _typed(),
    Column("note", Text),
    Column("state", String(8), nullable=False),
    Column("why", Text),
    Column("sheet_row", String(80), unique=True),
)

# files kept byte for byte, each once, addressed by what is in it
kept_file = Table(
    "kept_file",
    metadata,
    Column("id", Integer, primary_key=True),
    Column("digest", String(64), nullable=False, unique=True),  # SHA-256 of the content, in hex
    Column("name", String(255), nullable=False),
    Column("size", Integer, nullable=False),
    Column("content", LargeBinary, nullable=False),
)

# a file of positions reduced for a run; one at a time is in use, those before it stay
track = Table(
    "track",
    metadata,
    Column("id", Integer, primary_key=True),
    _code(),
    Column("run_id", ForeignKey("run.id"), nullable=False, index=True),
    Column("file_id", ForeignKey("kept_file.id"), nullable=False, index=True),
    Column("settings", JSON, nullable=False),
    Column("result", JSON, nullable=False),
    Column("replaced", JSON, nullable=False),  # key that the track brought -> what was typed, null for nothing
    Column("at", String(20), nullable=False),
    Column("by", String(64), nullable=False),
    Column("state", String(8), nullable=False),
    Column("why", Text),
    CheckConstraint("state IN ('in use', 'replaced')", name="state"),
)

SHELF = {"fluid": fluid, "material": material, "swimmer": swimmer, "rig": rig}
