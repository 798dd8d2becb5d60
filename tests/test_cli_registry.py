"""The command line on the registry: dialects of runs and figures, own numbers, regimes, published points, budgets."""

import csv
import io
import json
import re

import pytest
from terminal import run

OWN = ("key=inv_stride", "name=beats per length", "formula=f * L_body / U", "compares=beat to advance",
       "source=own definition", "example=f = 2 Hz, L_body = 30 mm, U = 12 mm/s", "answer=5.00")  # fmt: skip


@pytest.fixture(autouse=True)
def _who(monkeypatch):
    monkeypatch.setenv("LABBOOK_BY", "tester")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)


@pytest.fixture
def bench(tmp_path):
    """A book with one rod in silicone oil and three runs."""
    path = tmp_path / "bench.db"
    run("new", path)
    for kind, cells in {
        "fluid": ("code=oil", "kind=silicone-oil", "grade=5000 cSt"),
        "material": ("code=sil", "rho_s=1.07 g/cm3"),
        "swimmer": ("code=reed", "form=flexible tail", "material=sil", "L_body=34 mm", "L_tail=30.0(1) mm",
                    "d=1.00(1) mm"),
        "reading": ("of=sil", "key=E", "value=1.50(3) MPa", "on=2026-02-20"),
    }.items():  # fmt: skip
        run(kind, path, *cells)
    for i, f in enumerate(("0.5 Hz", "1 Hz", "2 Hz")):
        run("log", path, "swimmer=reed", "fluid=oil", f"f={f}", "U=0.051(3) mm/s", "T=22.4 degC",
            f"at=2026-03-0{i + 1}T10:00", "A_tip=2.0(1) mm", "--confirm")  # fmt: skip
    return path


def as_json(*words):
    return json.loads(run(*words, "--as", "json").stdout)


class TestDialects:
    def test_json_restates_value_and_u_and_says_so(self, bench):
        house, spoken = as_json("runs", bench), as_json("runs", bench, "--dialect", "Sp=rate:f,power:1")
        for one, two in zip(house, spoken, strict=True):
            # zeta_n f L^4/EI is Sp^4/(2 pi), and its relative uncertainty four times that of Sp
            assert two["Sp"] == pytest.approx(one["Sp"] ** 4 / 6.283185307, rel=1e-9)
            assert two["u_Sp"] / two["Sp"] == pytest.approx(4 * one["u_Sp"] / one["Sp"], rel=1e-9)
            assert two["dialects"] == {"Sp": "rate f, power 1"} and "dialects" not in one
            assert (two["regimes"], two["Re"]) == (one["regimes"], one["Re"])

    def test_csv_and_table_say_it_too(self, bench):
        rows = list(csv.DictReader(io.StringIO(run("runs", bench, "--as", "csv", "--dialect", "Sp=power:1").stdout)))
        assert {r["dialect"] for r in rows} == {"Sp: power 1"} and float(rows[0]["Sp"]) > 100
        table = run("runs", bench, "--dialect", "Sp=power:1").stdout
        assert "Sp (power 1)" in table and "house dialect" in table

    def test_ranges_are_read_in_the_house_dialect(self, bench):
        value = as_json("runs", bench)[0]["Sp"]
        found = as_json("runs", bench, "--range", "Sp", value * 0.99, value * 1.01, "--dialect", "Sp=power:1")
        assert len(found) == 1

    def test_a_run_that_has_none_says_why(self, bench):
        row = as_json("runs", bench, "--dialect", "Sp=coefficient:lighthill")[0]
        assert row["Sp"] is None and "helix pitch" in row["why_absent"]["Sp"]
        assert "3 runs without Sp" in run("runs", bench, "--dialect", "Sp=coefficient:lighthill").stdout

    def test_a_figure_carries_it(self, bench, tmp_path):
        figure = tmp_path / "fig.svg"
        run("draw", bench, "Sp", "stride", "-o", figure, "--dialect", "Sp=rate:f")
        text = figure.read_text(encoding="utf-8")
        assert "rate f" in text

    @pytest.mark.parametrize("wrong", ["Sp", "Sp=rate", "Sp=rate:Hz", "wall=rate:f", "Sp=rate:f,rate:omega"])
    def test_one_that_cannot_be_is_refused_in_one_sentence(self, bench, wrong):
        said = run("runs", bench, "--dialect", wrong, code=1).stderr
        assert said.count("\n") == 1 and said.rstrip().endswith(".")

    def test_the_house_dialect_is_changed_with_a_reason(self, bench):
        before = as_json("runs", bench)[0]["Sp"]
        assert "why" in run("dialect", bench, "Sp=power:1", code=1).stderr
        told = run("dialect", bench, "Sp=power:1", "--why", "as our theory paper").stdout
        assert "power: 1" in told or "power 1" in told
        assert as_json("runs", bench)[0]["Sp"] == pytest.approx(before**4, rel=1e-12)
        assert "nothing stale" in run("check", bench).stdout


class TestOwnNumbers:
    def test_added_changed_and_withdrawn(self, bench):
        assert "version 1: 3 kept runs" in run("number", bench, *OWN).stdout
        row = as_json("runs", bench)[0]
        assert row["inv_stride"] == pytest.approx(row["f"] * row["L_body"] / row["U"], rel=1e-12)
        again = [c if not c.startswith("formula") else "formula=2 * f * L_body / U" for c in OWN[:-1]]
        assert "version 2" in run("number", bench, *again, "answer=10.0", "--why", "both strokes").stdout
        listed = next(r for r in as_json("numbers", bench) if r["key"] == "inv_stride")
        assert (listed["version"], listed["runs"], listed["formula"]) == (2, 3, "2 * f * L_body / U")
        run("number", bench, "key=inv_stride", "--withdraw", "--why", "unused")
        assert "inv_stride" not in as_json("runs", bench)[0]

    def test_a_formula_that_is_not_pure_changes_nothing(self, bench):
        wrong = [c if not c.startswith("formula") else "formula=f * L_body" for c in OWN]
        assert "L T^-1 is left over" in run("number", bench, *wrong, code=1).stderr
        assert "inv_stride" not in as_json("runs", bench)[0]


def test_a_regime_is_set_counted_and_withdrawn(bench):
    said = run("regime", bench, "name=fast", "band=f_is > 1", "source=own", "--why", "try", code=1).stderr
    assert said.count("\n") == 1
    told = run("regime", bench, "name=strong bend", "band=3 <= Sp < 100", "second=Re_omega < 1", "colour=sky", "source=own",
               "--why", "what we look for").stdout  # fmt: skip
    rows = as_json("runs", bench)
    by_hand = [r["code"] for r in rows if 3 <= r["Sp"] < 100 and r["Re_omega"] < 1]
    assert f"{len(by_hand)} kept runs lie in it" in told
    assert [r["code"] for r in as_json("runs", bench, "--regime", "strong bend")] == by_hand
    run("regime", bench, "name=strong bend", "--withdraw", "--why", "done")
    run("runs", bench, "--regime", "strong bend", code=1)


def test_published_points_are_entered_and_withdrawn(bench):
    point = ("series=pond-2019", "citation=Pond & Weir (2019), invented", "x=Sp", "x_value=2.0(1)", "y=stride",
             "y_value=0.01")  # fmt: skip
    assert run("published", bench, *point).stdout == "pond-2019\n"
    assert "no number" in run("published", bench, *point[:2], "x=Bo", *point[3:], code=1).stderr
    assert "withdrawn" in run("published", bench, "series=pond-2019", "--withdraw", "--why", "error").stdout


class TestFigures:
    POINT = ("series=pond-2019", "citation=Pond & Weir (2019), invented", "x=Sp", "x_value=2.0(1)", "x_dialect=rate:f",
             "y=stride", "y_value=0.01")  # fmt: skip

    def drawn(self, bench, tmp_path, *options):
        """What the command says, and the words of the figure."""
        figure = tmp_path / "fig.svg"
        said = run("draw", bench, "Sp", "stride", "-o", figure, *options).stdout
        return said, " ".join(re.sub(r"<[^>]*>", " ", figure.read_text(encoding="utf-8")).split())

    def test_published_points_are_drawn_beside_the_runs_and_not_counted(self, bench, tmp_path):
        bare, _ = self.drawn(bench, tmp_path)
        run("published", bench, *self.POINT)
        said, words = self.drawn(bench, tmp_path)
        assert said.splitlines()[0] == bare.splitlines()[0] and said.startswith("3 runs drawn")
        assert "1 published points drawn beside them" in said
        assert "pond-2019 (Pond &amp; Weir (2019), invented), 1 point" in words
        without, words = self.drawn(bench, tmp_path, "--no-published")
        assert without == bare and "pond-2019" not in words

    def test_those_without_a_value_in_the_dialect_are_told(self, bench, tmp_path):
        run("published", bench, *self.POINT)
        said, words = self.drawn(bench, tmp_path, "--dialect", "Sp=length:L_body")
        assert "0 published points drawn beside them, 1 not: the figure says why" in said
        assert "1 published point not drawn: no Sp in this dialect (needs L_body)" in words

    @pytest.mark.parametrize(("bars", "said"), [
        ("own", "Bars: the run's own part of one standard uncertainty"),
        ("shared", "Bars: the shared part of one standard uncertainty"), ("total", "Bars: one standard uncertainty"),
        ("band", "Bands: what runs of one swimmer share at most (fluid, material, swimmer, rig), 2 u"), ("none", ""),
    ])  # fmt: skip
    def test_every_kind_of_bars(self, bench, tmp_path, bars, said):
        _, words = self.drawn(bench, tmp_path, "--bars", bars)
        assert said in words and ("Bars:" in words) == (bars != "none") and ("Bands:" in words) == (bars == "band")
        run("draw", bench, "Sp", "stride", "-o", tmp_path / "fig.svg", "--bars", "some", code=2)


def test_a_budget_names_what_to_measure_better(bench):
    told = run("budget", bench, "R-0001", "--simulate").stdout
    assert "diameter" in told and "%" in told and "Monte Carlo, 200000 draws" in told
    assert "has none" in run("budget", bench, "R-0001", "--number", "wall", code=1).stderr
    assert "no number" in run("budget", bench, "R-0001", "--number", "Bo", code=1).stderr
    assert "no such run" in run("budget", bench, "R-9999", code=1).stderr
