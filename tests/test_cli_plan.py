"""The command line's plan: what it prints, what it writes, what it refuses and what is wrong usage."""

import csv
import io
import json

import pytest
from terminal import run


@pytest.fixture(scope="module")
def bench(tmp_path_factory):
    """A book with one rod, two oils and three runs."""
    path = tmp_path_factory.mktemp("plan") / "bench.db"
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("LABBOOK_BY", "tester")
        run("new", path)
        for kind, cells in (
            ("fluid", ("code=thin", "kind=silicone-oil", "grade=1000 cSt")),
            ("fluid", ("code=thick", "kind=silicone-oil", "grade=12500 cSt")),
            ("material", ("code=sil", "rho_s=1.07 g/cm3")),
            ("reading", ("of=sil", "key=E", "value=1.50(3) MPa", "on=2026-02-20")),
            (
                "swimmer",
                (
                    "code=reed",
                    "form=flexible tail",
                    "material=sil",
                    "L_body=24 mm",
                    "L_tail=20.0(1) mm",
                    "d=1.00(1) mm",
                    "b=2.00(2) mm",
                ),
            ),
            ("rig", ("code=coil", "kind=Helmholtz pair", "current_to_B=1.1 mT/A")),
        ):
            run(kind, path, *cells)
        for i, f in enumerate(("0.02 Hz", "0.2 Hz", "1.0 Hz")):
            run(
                "log",
                path,
                "swimmer=reed",
                "fluid=thick",
                "rig=coil",
                f"f={f}",
                "U=0.011(3) mm/s",
                "T=22.4 degC",
                "theta0=0.25 rad",
                f"at=2026-03-0{i + 1}T10:00",
                "--confirm",
            )
    return path


def test_each_fluid_at_the_target_the_best_first(bench):
    said = run("plan", bench, "reed", "--sp", "2").stdout
    assert said.startswith("reed at Sp = 2\n")
    assert "as in R-0003, the last kept run of reed: rig coil" in said and "theta0 0.25 rad" in said
    lines = [line.split() for line in said.splitlines() if line[:1].isdigit() and "2.00(" in line]
    assert [line[1] for line in lines] == ["thick", "thin"] and lines[0][-1] == "good"


def test_without_a_target_the_predicted_optimum_is_taken_and_said(bench):
    assert "where the predicted scaled speed is largest" in run("plan", bench, "reed").stdout


def test_json_lands_on_the_target(bench):
    rows = json.loads(run("plan", bench, "reed", "T=22.0 degC", "--sp", "2.5", "--as", "json").stdout)
    assert {r["fluid"] for r in rows} == {"thin", "thick"}
    assert [r["Sp"] for r in rows] == pytest.approx([2.5, 2.5], rel=1e-6)


def test_one_frequency_and_the_viscosity_that_would_do(bench):
    said = run("plan", bench, "reed", "--f", "0.1", "--sp", "2", "--fluid", "thick").stdout
    assert said.startswith("reed at 0.1 Hz\nSp = 2 there takes a viscosity of ")
    assert "thin" not in said


def test_a_sheet_leaves_out_what_is_forbidden_unless_the_fluid_was_named(bench):
    # rho omega L^2/mu at 1 Hz: 970 x 6.28 x 4e-4/0.97 = 2.5 in the thin oil, a twelfth of it in the thick one
    def fluids(*words):
        text = run("plan", bench, "reed", "--f", "1", *words, "--as", "csv").stdout
        return [row["fluid"] for row in csv.DictReader(io.StringIO(text))]

    assert fluids() == ["thick"]
    assert fluids("--fluid", "thin") == ["thin"]


def test_proposals_as_a_sheet_by_the_files_name_and_as_a_page(bench, tmp_path):
    said = run("plan", bench, "reed", "-n", "3", "--fill", "Sp,theta0", "-o", tmp_path / "next.csv").stdout
    assert said == f"planned into {tmp_path / 'next.csv'}\n"
    rows = list(csv.DictReader(io.StringIO((tmp_path / "next.csv").read_text(encoding="utf-8"))))
    assert len(rows) == 3 and {r["swimmer"] for r in rows} == {"reed"}
    run("plan", bench, "reed", "-n", "2", "--top", "-o", tmp_path / "next.html")
    page = (tmp_path / "next.html").read_text(encoding="utf-8")
    assert page.startswith("<!doctype html>") and "pins down the maximum" in page
    assert "maximin distance" in run("plan", bench, "reed", "--fill", "Sp,Re_omega").stdout


def test_the_inverse_question(bench):
    said = run("plan", bench, "reed", "--inverse", "E", "--f", "0.1Hz", "--sp", "2").stdout
    assert said.startswith("E of reed that gives Sp = 2 at 0.1 Hz (now 1.5 MPa)\n1 % of E moves Sp by 0.25 %")
    assert "batches on the shelf, the nearest first: sil 1.5 MPa" in said
    rows = json.loads(
        run("plan", bench, "reed", "--inverse", "d", "--f", "0.1Hz", "--sp", "2", "--as", "json").stdout
    )
    assert [r["Sp"] for r in rows] == pytest.approx([2.0, 2.0], rel=1e-6)
    header = run("plan", bench, "reed", "--inverse", "d", "--f", "0.1Hz", "--as", "csv").stdout.splitlines()[
        0
    ]
    assert header.startswith("fluid,d [m],now [m],f [Hz],Sp,u_Sp")


def test_a_tail_that_is_still_to_be_built(bench):
    cells = ("form=flexible tail", "L_body=24 mm", "L_tail=20 mm", "d=1 mm", "b=2 mm", "material=sil")
    said = run("plan", bench, "new", *cells, "--sp", "2").stdout
    assert (
        "new as planned here is not on the shelf" in said and "the newest of a flexible tail swimmer" in said
    )


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("reed", "--sp", "400"), "no fluid reaches it"),
        (("rush",), "no swimmer has this code"),
        (("reed", "colour=red"), "is no cell of a planned run"),
        (("reed", "--fluid", "tar"), "no fluid has this code"),
        (("reed", "--f", "1 mm"), "f '1 mm'"),
        (("reed", "--inverse", "t", "--f", "1Hz"), "one of d, L_tail, E, mu"),
        (("reed", "-n", "0"), "how many runs to propose"),
        (("reed", "--fill", "Sp"), "names no plane"),
        (("new", "form=flexible tail", "L_body=24 mm", "L_tail=20 mm", "d=1 mm"), "names no material"),
        (("reed", "-o", "/no/such/folder/plan.csv"), "cannot be written"),
    ],
)
def test_a_refusal_is_one_sentence_with_exit_code_1(bench, words, said):
    done = run("plan", bench, *words, code=1)
    assert said in done.stderr and len(done.stderr.splitlines()) == 1 and done.stdout == ""


@pytest.mark.parametrize(
    "words",
    [
        ("--fill", "Sp,theta0", "--top"),
        ("--inverse", "d"),
        ("--inverse", "d", "--f", "1", "-n", "3"),
        ("-n", "3", "--f", "1"),
        ("--within", "Sp", "1", "2"),
        ("--strict",),
        ("--inverse", "d", "--f", "1", "--as", "html"),
        ("not a cell",),
    ],
)
def test_wrong_usage_has_exit_code_2(bench, words):
    run("plan", bench, "reed", *words, code=2)


def test_the_help_shows_examples():
    said = run("plan", "--help").stdout
    assert "labbook plan b.db reed-03 --inverse d --f 1Hz" in said and "key=value" in said
