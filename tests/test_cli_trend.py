"""`labbook trend`: tables, text and numbers of the same statistics, and what is refused."""

import json
import re

import pytest
from click.testing import CliRunner

from labbook.cli import main


def run(*words):
    return CliRunner().invoke(main, ["trend", *map(str, words)], prog_name="labbook")


@pytest.fixture(scope="module")
def numbers(demo_book):
    done = run(demo_book, "Sp", "U_scaled", "--as", "json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def test_tables_by_material_where_nothing_is_chosen(demo_book, numbers):
    done = run(demo_book, "Sp", "U_scaled")
    assert done.exit_code == 0, done.output
    top = numbers["maximum"]
    lines = done.stdout.splitlines()
    assert lines[0] == f"{numbers['runs_used']} of {numbers['runs_found']} runs: kept, flexible tail"
    (whole,) = [line for line in lines if line.startswith("all runs")]
    assert f"{top['x']:.3f} ({top['x_low']:.3f} to {top['x_high']:.3f})" in whole
    for title in ("Maximum", "Slope", "Change over time", "Outliers", "Repeats", "left out"):
        assert title in lines
    for family in numbers["families"]:
        assert any(line.startswith(family["name"]) for line in lines)
    assert f"  {numbers['excluded']['of form helix']} of form helix" in lines
    assert not re.search(r"\bnan\b", done.stdout)


def test_the_text_is_for_a_paper(demo_book, numbers):
    done = run(demo_book, "Sp", "U_scaled", "--as", "text", "--family", "none")
    assert done.exit_code == 0, done.output
    assert f"at Sp = {numbers['maximum']['x']:.3f} (95 % interval" in done.stdout
    assert "Axes: Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect" in done.stdout
    assert "Excluded beforehand: 26 runs void" in done.stdout and "By material" not in done.stdout
    assert re.search(r"demo\.db, \d{4}-\d\d-\d\d\.$", done.stdout.strip())


def test_filters_family_form_and_range(demo_book, numbers):
    done = run(demo_book, "Sp", "U_scaled", "--range", "Re_omega", "0", "1", "--family", "fluid", "--between", "0.9",
               "1.5", "--as", "json")  # fmt: skip
    found = json.loads(done.stdout)
    assert found["runs_found"] < numbers["runs_found"] and "Re_omega" in found["question"]
    assert {"sil5000-a", "syrup-a"} <= {f["name"] for f in found["families"]}
    (slope,) = found["slopes"]
    assert slope["low"] >= 0.9 and slope["high"] <= 1.5 and slope["slope_low"] < slope["slope"] < slope["slope_high"]
    helix = json.loads(run(demo_book, "f_ratio", "stride", "--form", "helix", "--as", "json").stdout)
    assert helix["form"] == "helix" and not helix["maximum"]["found"] and "at the high end" in helix["maximum"]["said"]
    every = json.loads(run(demo_book, "f", "U", "--form", "all", "--as", "json", "--family", "none").stdout)
    assert every["form"] == "all" and not [why for why in every["excluded"] if why.startswith("of form")]


def test_into_a_file(demo_book, tmp_path):
    done = run(demo_book, "Sp", "U_scaled", "--family", "none", "-o", tmp_path / "trend.txt")
    assert done.stdout == f"written into {tmp_path / 'trend.txt'}\n"
    assert (tmp_path / "trend.txt").read_text(encoding="utf-8").startswith("467 of 894 runs")
    refused = run(demo_book, "Sp", "U_scaled", "--family", "none", "-o", tmp_path / "no" / "trend.txt")
    assert refused.exit_code == 1 and "cannot be written" in refused.stderr


@pytest.mark.parametrize(("words", "code", "said"), [
    (("Sp", "nope"), 1, "key 'nope': is no quantity or number of a run"),
    (("Sp", "U_scaled", "--form", "helix"), 1, "none of the 106 runs of form helix"),
    (("Sp", "U_scaled", "--form", "eel"), 1, "form 'eel': no run that was found is of this form"),
    (("Sp", "U_scaled", "--state", "void"), 1, "void runs stay out of statistics"),
    (("Sp", "U_scaled", "--range", "Sp", "50", "60"), 1, "no kept run was found"),
    (("Sp", "U_scaled", "--between", "2", "1"), 1, "between '2 to 1': is no range; give the lower end first."),
    (("Sp", "U_scaled", "--between", "nan", "1"), 2, "--between takes two numbers"),
    (("Sp", "U_scaled", "--family", "person"), 2, "'person' is not one of"),
    (("Sp", "U_scaled", "--fluid", "gin"), 1, "no fluid has this code"),
    (("Sp",), 2, "Missing argument 'Y'"),
])  # fmt: skip
def test_what_is_refused_is_said_in_a_sentence(demo_book, words, code, said):
    done = run(demo_book, *words)
    assert (done.exit_code, done.stdout) == (code, "") and said in done.stderr, done.output


def test_few_runs_are_told_and_not_refused(demo_book):
    done = run(demo_book, "Sp", "U_scaled", "--swimmer", "sedge-04", "--as", "text")
    assert done.exit_code == 0, done.output
    assert "from 6 runs of 1 swimmer; no interval: one swimmer in the range" in done.stdout
    one = run(demo_book, "Sp", "U_scaled", "--swimmer", "reed-01", "--range", "Sp", "1.9", "2.1", "--as", "text")
    assert one.exit_code == 0 and "over Sp can be told: 2 usable runs, and a curve" in one.stdout, one.output
    assert "no power law, 2 usable runs lie in the range" in one.stdout
