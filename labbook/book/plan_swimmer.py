"""The swimmer that runs are planned for: on the shelf, changed from there, or still to be built."""

from collections.abc import Mapping

from sqlalchemy import Connection, select

from labbook.book.arrivals import unknown
from labbook.book.drafts import Draft, read_draft, whole
from labbook.book.records import KINDS
from labbook.book.shelf import Item, Reading, read_shelf
from labbook.book.tables import material, swimmer
from labbook.errors import Refusal
from labbook.registry.typed import Typed, printed, read

E_CELL = "E"
NEW = 1  # id of what is not on the shelf: it meets no other swimmer or material there
SWIMMER_CELLS = tuple(c for c in KINDS["swimmer"].columns if c not in ("code", "parent", "built", "note"))
_TEXTS = ("form", "section", "material")


def swimmer_of(connection: Connection, code: str, cells: Mapping[str, str]) -> tuple[Item, Item | None, bool]:
    """(the swimmer, its material, whether it is still to be built), from a code and cells that change it.

    Refuses a code that the shelf does not hold where the cells do not describe a swimmer, and impossible
    cells.
    """
    build = {k: v for k, v in cells.items() if k in SWIMMER_CELLS}
    found = connection.execute(select(swimmer.c.id).where(swimmer.c.code == code)).scalar_one_or_none()
    if found is None and "form" not in build:
        refusal = unknown(connection, swimmer, "swimmer", code)
        more = "or describe one still to be built: form='flexible tail' L_body='30 mm' L_tail='24 mm' ..."
        raise Refusal("swimmer", code, refusal.reason, f"{refusal.remedy}; {more}")
    shelf = read_shelf(connection, [found] if found else [], [], [])
    item = shelf.swimmers.get(found)
    own = shelf.materials.get(item.texts["material_id"]) if item else None
    if build:
        before = {} if item is None else _cells(item, own)
        item = _item(code, whole(read_draft("swimmer", {"code": code} | before | build)))
        if "material" in build:
            own = _material(connection, build["material"])
    if E_CELL in cells:
        own = with_modulus(read("E", cells[E_CELL]))
    if own is not None or build:
        item = made_of(item, own)
    return item, own, bool(build) or E_CELL in cells


def _cells(item: Item, own: Item | None) -> dict[str, str]:
    """A swimmer's cells as they would be typed again."""
    texts = {k: item.texts[k] for k in ("form", "section") if item.texts[k]}
    typed = {k: printed(k, Typed(*entry)) for k, entry in item.typed.items()}
    return texts | typed | ({"material": own.code} if own else {})


def _item(code: str, draft: Draft) -> Item:
    texts = {
        "form": draft.text("form"),
        "section": draft.text("section"),
        "material_id": None,
        "parent_id": None,
        "built": None,
        "note": None,
        "retired": False,
    }
    return Item(NEW, code, texts, draft.document())


def _material(connection: Connection, code: str) -> Item:
    found = connection.scalar(select(material.c.id).where(material.c.code == code))
    if found is None:
        refusal = unknown(connection, material, "material", code)
        raise Refusal("material", code, refusal.reason, f"{refusal.remedy}; or give E='0.5 MPa' in its place")
    return read_shelf(connection, [], [], [], [found]).materials[found]


def made_of(item: Item, own: Item | None) -> Item:
    """The swimmer, made of this material."""
    return Item(item.id, item.code, item.texts | {"material_id": own.id if own else None}, item.typed)


def with_modulus(E: Typed, id_: int = NEW) -> Item:
    """A material of this modulus, in place of a batch."""
    reading = Reading("", "E", E.value, E.u, None, 0.0, None, "kept", E.origin)
    return Item(id_, f"E {E.value:.3g} Pa", {"kind": None, "made": None}, {}, (reading,))


def with_size(item: Item, key: str, value: float, id_: int) -> Item:
    """The swimmer with one of its sizes (m) another one, as well known as before in relative terms."""
    entry = item.typed.get(key)
    u = 0.0 if entry is None else abs(value) * entry[3] / entry[2]
    return Item(
        id_,
        item.code,
        item.texts,
        item.typed | {key: [f"{value:.6g}", "m", float(value), float(u), "stated"]},
    )
