"""Drafts: what a row's cells come to, its fingerprint, its quantities in JSON, and rows of several layouts together."""

import gc
import hashlib
import json

import pytest

from labbook import Refusal, Refusals
from labbook.book.drafts import DraftReader, fingerprints, in_columns, read_draft, typed_in_json
from labbook.exchange import sheets
from labbook.registry.typed import read

COLUMNS = ("swimmer", "fluid", "T", "at", "f", "T_end", "U", "note")
UNITS = {"f": "Hz", "T": "degC", "T_end": "degC", "U": "mm/s"}
ROWS = (
    ("reed-1", "syrup", "22.0", "2026-03-02T10:00Z", "0.50", "22.5", "0.051(3)", "größer \"ä\" \\ 1"),
    ("reed-1", "syrup", "", "2026-03-02T10:01Z", "30 rpm", "", "-5.1(3)e-2", ""),
    ("reed-1", "syrup", "22.0", "2026-03-02T10:02Z", "0.50 +- 1 %"),
    (" reed-1 ", "syrup", None, "2026-03-02T10:03Z", "0.5", "   ", "", "two\nlines"),
)  # fmt: skip


def drafts(rows=ROWS, columns=COLUMNS):
    found, refused = DraftReader("run", columns, UNITS).read(rows)
    assert refused == []
    return found


def test_a_fingerprint_is_the_digest_of_sorted_columns_with_their_contents():
    """The recipe that fingerprints in existing books were made by, written out with the standard library."""
    for draft, print_ in zip(drafts(), fingerprints(drafts()), strict=True):
        told = sorted(f"{column}\x1e{content}" for column, content in draft.content().items())
        by_hand = hashlib.blake2b("\x1f".join(told).encode(), digest_size=16).hexdigest()
        assert print_ == draft.fingerprint() == by_hand


def test_a_content_says_the_unit_and_leaves_empty_cells_out():
    first, second, third, last = (draft.content() for draft in drafts())
    assert first["T"] == "22.0 degC" and first["U"] == "0.051(3) mm/s" and first["f"] == "0.50 Hz"
    assert second == {"swimmer": "reed-1", "fluid": "syrup", "at": "2026-03-02T10:01:00Z", "f": "30 rpm",
                      "U": "-5.1(3)e-2 mm/s"}  # fmt: skip
    assert list(third) == ["swimmer", "fluid", "at", "T", "f"], "texts first, each in the order of the sheet"
    assert last["note"] == "two\nlines" and last["swimmer"] == "reed-1"


def test_the_order_of_the_columns_does_not_reach_the_fingerprint():
    order = [7, 2, 5, 0, 4, 6, 3, 1]
    turned = [[row[i] if i < len(row) else "" for i in order] for row in ROWS]
    assert fingerprints(drafts(turned, [COLUMNS[i] for i in order])) == fingerprints(drafts())


def test_quantities_in_json_are_what_the_standard_library_writes():
    for draft, text in zip(drafts(), typed_in_json(drafts()), strict=True):
        assert text == json.dumps(draft.typed, ensure_ascii=False)
        assert {k: tuple(v) for k, v in json.loads(text).items()} == {k: tuple(v) for k, v in draft.typed.items()}
    odd = read_draft("run", {"f": '0.5\u00a0Hz', "U": "1.0e+300 mm/s", "A_tip": "1e-320 mm"})[0]
    assert typed_in_json([odd])[0] == json.dumps(odd.typed, ensure_ascii=False)


def test_a_cell_holds_the_quantity_as_columns_take_it():
    cells = in_columns(drafts())
    U = read("U", "0.051(3)", "mm/s")
    assert (cells["U"][0].value, cells["U"][0].u, cells["U"][0].digits) == (U.value, U.u, False)
    assert cells["f"][0].digits and not cells["f"][2].digits
    assert cells["U"][2].typed is None and cells["U"][2].value != cells["U"][2].value, "absent is NaN"


def test_drafts_of_several_layouts_stand_in_columns_together():
    two = drafts() + drafts([("syrup", "v.mp4", "reed-2", "2026-03-03T10:00Z", "1.0")],
                            ("fluid", "video", "swimmer", "at", "f")) + drafts(ROWS[:1])  # fmt: skip
    cells = in_columns(two)
    assert {len(column) for column in cells.values()} == {6}
    assert [c.text for c in cells["swimmer"]] == ["reed-1"] * 4 + ["reed-2", "reed-1"]
    assert [c.text for c in cells["video"]] == [None] * 4 + ["v.mp4", None]
    assert [c.said for c in cells["U"]] == ["0.051(3) mm/s", "-5.1(3)e-2 mm/s", "", "", "", "0.051(3) mm/s"]
    assert fingerprints(two) == [draft.fingerprint() for draft in two]
    assert typed_in_json(two) == [typed_in_json([draft])[0] for draft in two]


def test_a_bad_row_among_good_ones_is_named_by_its_place():
    rows = [list(ROWS[0]) for _ in range(5)]
    rows[1][4], rows[3][0], rows[4] = "fast", "", ["reed-1"]
    read_, refused = DraftReader("run", COLUMNS, UNITS).read(rows)
    assert [(i, r.field) for i, r in refused] == [(1, "f"), (3, "swimmer"), (4, "fluid"), (4, "at"), (4, "f")]
    assert len(read_) == 5 and read_[1].quantity("f") is None and read_[0].quantity("f").text == "0.50"


@pytest.mark.parametrize(("cells", "fields"), [
    ({}, ["swimmer", "fluid", "at", "f"]), ({"colour": "red", "f": "1 Hz"}, ["colour", "swimmer", "fluid", "at"]), ({"colour": "", "f": "x"}, ["f", "swimmer", "fluid", "at"]),
])  # fmt: skip
def test_what_is_missing_or_no_column_is_refused(cells, fields):
    assert [r.field for r in read_draft("run", cells)[1]] == fields


def test_a_value_is_read_as_its_rows_key_says():
    rows = [("mu", "4.5(1) Pa.s", "oil", "20 degC"), ("rho", "4.5(1) Pa.s", "oil", ""), ("rho", "0.97(1) g/cm3", "oil", "")]
    found, refused = DraftReader("reading", ("key", "value", "of", "T")).read(rows)
    assert [(i, r.field) for i, r in refused] == [(1, "value")], "the same text is a viscosity, and no density"
    assert found[0].typed["value"].value == 4.5 and found[2].typed["value"].value == pytest.approx(970, rel=1e-12)


def test_filled_gives_texts_only_where_there_are_none():
    draft = read_draft("fluid", {"code": "syrup", "kind": ""})[0].filled(kind="water", code="other", note="n")
    assert draft.texts == {"code": "syrup", "kind": "water", "note": "n"}


def test_two_sheets_of_runs_with_other_columns_load_together(stocked):
    first = "swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\nreed-1,syrup,2026-03-02T10:00Z,0.50,22.0,0.051(3)\n"
    second = "U [um/s],at,note,fluid,swimmer,f [rpm]\n60(2),2026-03-02T11:00Z,later,syrup,reed-1,60\n"
    tables = [sheets.table_from_text(text, f"{n}.csv", "run") for n, text in enumerate((first, second))]
    assert stocked.load_tables(tables, "two", by="wren").added["run"] == 2
    runs = stocked.runs()
    assert runs["U"].tolist() == pytest.approx([5.1e-5, 6.0e-5], rel=1e-12)
    assert runs["f"].tolist() == pytest.approx([0.5, 1.0], rel=1e-12)
    assert runs["note"].fillna("").tolist() == ["", "later"]
    assert stocked.load_tables(tables[::-1], "two", by="wren").known == 2
    assert stocked.check() == []


def test_the_collector_runs_again_after_a_refused_sheet(stocked, tmp_path):
    path = tmp_path / "runs.csv"
    path.write_text("swimmer,fluid,at,f [Hz]\nnobody,syrup,2026-03-02T10:00Z,fast\n", encoding="utf-8")
    with pytest.raises(Refusals):
        stocked.load(path, by="wren")
    assert gc.isenabled()
    gc.disable()
    try:
        sheets.read_tables(path)
        assert not gc.isenabled(), "what the caller chose stays"
    finally:
        gc.enable()
    with pytest.raises(Refusal):
        sheets.read_tables(tmp_path / "none.csv")
    assert gc.isenabled()
