"""The reduce command: hand-made tracks whose figures are known, its JSON, many tracks at once, runs, refusals.

The tracks are exact motions, v t plus circular functions, so every expected value is the number the track was made
with; the only noise is that of the last printed digit, 1e-9 mm.
"""

import csv
import io
import json
import math

import numpy as np
import pytest
from terminal import run as command

from labbook import Book
from labbook.physics import tracks

KEYS = ["U", "u_U", "U_low", "U_high", "f_beat", "u_f_beat", "amplitude", "u_amplitude", "net_per_cycle",
        "u_net_per_cycle", "p_zero", "A_tip", "u_A_tip", "cycles", "frames", "gaps", "axis", "drift"]  # fmt: skip
FPS, N, F = 50, 500, 1.0
T = np.arange(N) / FPS  # ten cycles
EXACT = 1e-6  # rounding to 1e-9 mm moves U by 1e-10 of itself; the beat's extremes lie on 240 phases, 1e-4
PHASES = 1e-4  # (1 - cos(pi/240)) = 8.6e-5 of a peak to peak at most


@pytest.fixture(autouse=True)
def _environment(monkeypatch, tmp_path):
    monkeypatch.setenv("LABBOOK_BY", "tester")
    monkeypatch.delenv("LABBOOK_BOOK", raising=False)
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))
    monkeypatch.chdir(tmp_path)


def run(*words, code=0):
    """`labbook reduce` with these words."""
    return command("reduce", *words, code=code)


def figures(*words):
    return json.loads(run(*words, "--as", "json").stdout)


def write(path, columns):
    lines = [",".join(columns)]
    lines += [",".join(f"{v:.9f}" for v in row) for row in zip(*columns.values(), strict=True)]
    path.parent.mkdir(exist_ok=True)
    path.write_text("\n".join(lines) + "\n")
    return path


def swim(vx=0.3, vy=0.4, beat=0.5, tip=False, unit="mm", by=1.0, time="t [s]", t=T):
    """A swimmer at (vx, vy) mm/s that surges `beat` mm to either side along (0.6, 0.8), with a 2 mm wide tail tip."""
    surge = beat * np.sin(2.0 * np.pi * F * t + 0.3)
    x, y = 5.0 + vx * t + 0.6 * surge, 7.0 + vy * t + 0.8 * surge
    columns = {time: t, f"x [{unit}]": x / by, f"y [{unit}]": y / by}
    if tip:
        sweep = np.sin(2.0 * np.pi * F * t)  # mm to either side, across the axis
        columns |= {
            f"tip_x [{unit}]": (x - 3.0 - 0.8 * sweep) / by,
            f"tip_y [{unit}]": (y - 4.0 + 0.6 * sweep) / by,
        }
    return columns


@pytest.fixture
def track(tmp_path):
    return write(tmp_path / "swim.csv", swim(tip=True))


# ---- one track, exact


def test_figures_of_an_exact_track(track):
    found = figures(track, "--f", "1 Hz", "--axis", math.degrees(math.atan2(4.0, 3.0)))
    assert list(found)[: len(KEYS)] == KEYS
    assert found["U"] == pytest.approx(0.5e-3, rel=EXACT)
    assert found["axis"] == pytest.approx([0.6, 0.8], rel=1e-12) and found["axis_from"] == "given"
    assert found["f_beat"] == 1.0 and found["u_f_beat"] == 0.0
    assert found["amplitude"] == pytest.approx(0.5e-3, rel=PHASES)
    assert found["net_per_cycle"] == pytest.approx(0.5e-3, rel=EXACT)  # 0.5 mm/s for a second
    assert found["A_tip"] == pytest.approx(2.0e-3, rel=PHASES)
    assert found["excursion"] == pytest.approx(1.0e-3, rel=1.4e-3)  # looked for on 60 phases: 1 - cos(pi/60)
    assert found["cycles"] == pytest.approx(10.0, rel=1e-9)
    assert found["frames"] == N and found["gaps"] == 0 and found["drift"] == [0.0, 0.0]
    assert found["U_low"] <= found["U"] <= found["U_high"] and found["u_U"] < 1e-9
    assert found["p_zero"] < 1e-12 and found["free_path"] is None
    cycles = found["steadiness"]["per_cycle"]
    assert len(cycles) >= 8 and cycles == pytest.approx([0.5e-3] * len(cycles), rel=EXACT)


def test_what_is_not_given_comes_from_the_track(track):
    found = figures(track)
    assert found["f_beat"] == pytest.approx(1.0, rel=EXACT)
    assert found["axis"] == pytest.approx([0.6, 0.8], rel=EXACT) and found["axis_from"] == "velocity"
    assert found["U"] == pytest.approx(0.5e-3, rel=EXACT)
    assert figures(track, "--f", "fit", "--axis", "auto") == found


def test_without_a_tip_there_is_null(tmp_path):
    found = figures(write(tmp_path / "swim.csv", swim()), "--f", "1")
    assert found["A_tip"] is None and found["u_A_tip"] is None


@pytest.mark.parametrize("f", ["1", "1 Hz", "1000 mHz", "60 rpm"])
def test_a_frequency_in_any_of_its_units(track, f):
    assert figures(track, "--f", f)["f_beat"] == pytest.approx(1.0, rel=1e-12)


def test_the_axis_is_towards_the_head(track):
    assert figures(track, "--axis", "180", "--f", 1)["U"] == pytest.approx(-0.3e-3, rel=EXACT)
    assert figures(track, "--axis", "-90", "--f", 1)["U"] == pytest.approx(-0.4e-3, rel=EXACT)


def test_pixels_scale_and_frame_rate(tmp_path):
    by = 0.004  # mm a pixel
    path = write(tmp_path / "swim.csv", swim(unit="px", by=by, time="frame", t=T) | {"frame": np.arange(N)})
    found = figures(path, "--scale", "4.0(1) um/px", "--fps", FPS, "--f", "1")
    assert found["U"] == pytest.approx(0.5e-3, rel=EXACT)
    # a track without noise has the scale's uncertainty and no other: 2.5 %, of every length
    assert found["u_U"] == pytest.approx(0.025 * 0.5e-3, rel=1e-4)
    assert found["u_amplitude"] == pytest.approx(0.025 * found["amplitude"], rel=1e-4)
    assert found["U_high"] - found["U_low"] == pytest.approx(2 * 1.959964 * found["u_U"], rel=1e-3)
    slow = figures(path, "--scale", "4.0(1) um/px", "--fps", "25 fps", "--f", "0.5")
    assert slow["U"] == pytest.approx(0.25e-3, rel=EXACT)


def test_columns_by_name(tmp_path):
    columns = swim()
    named = {
        "clock": 1e3 * columns["t [s]"],
        "X_pos [mm]": columns["x [mm]"],
        "Y_pos [mm]": columns["y [mm]"],
    }
    path = write(tmp_path / "swim.csv", named)
    for given in (
        ["--columns", "x=X_pos,y=Y_pos,t=clock [ms]"],
        ["--columns", "x=X_pos", "--columns", "y=Y_pos,t=clock [ms]"],
    ):
        assert figures(path, *given, "--f", 1)["U"] == pytest.approx(0.5e-3, rel=EXACT)


def test_the_body_gives_the_axis(tmp_path):
    path = write(
        tmp_path / "swim.csv", swim(vx=-0.3, vy=-0.4) | {"heading [deg]": np.full(N, 53.13010235415598)}
    )
    found = figures(path, "--f", 1)
    assert found["axis_from"] == "body" and found["U"] == pytest.approx(-0.5e-3, rel=EXACT)


# ---- drift


def test_a_drift_as_typed_is_taken_off(track):
    found = figures(track, "--f", 1, "--axis", "0", "--drift", "0.100(3),0.200(4) mm/s")
    assert found["drift"] == pytest.approx([1e-4, 2e-4], rel=1e-12)
    assert found["u_drift"] == pytest.approx([3e-6, 4e-6], rel=1e-12)
    assert found["U"] == pytest.approx(0.2e-3, rel=EXACT)
    assert found["u_U"] == pytest.approx(3e-6, rel=1e-3)  # the axis is x


def test_a_drift_track_is_taken_off(track, tmp_path):
    tracer = write(tmp_path / "tracer.csv", swim(vx=0.1, vy=-0.2, beat=0.0))
    found = figures(track, "--f", 1, "--drift", tracer)
    assert found["drift"] == pytest.approx([1e-4, -2e-4], rel=EXACT)
    assert found["U"] == pytest.approx(math.hypot(0.2e-3, 0.6e-3), rel=EXACT)


def test_a_drift_track_in_pixels_takes_the_same_scale(tmp_path):
    by = 0.004
    columns = swim(unit="px", by=by) | {"frame": np.arange(N)}
    path = write(tmp_path / "swim.csv", {"frame": columns.pop("frame"), **columns} | {})
    tracer = swim(vx=0.1, vy=-0.2, beat=0.0, unit="px", by=by)
    drift = write(
        tmp_path / "tracer.csv", {"frame": np.arange(N), "x": tracer["x [px]"], "y": tracer["y [px]"]}
    )
    found = figures(path, "--scale", "4.0(1) um/px", "--fps", FPS, "--f", 1, "--drift", drift)
    assert found["drift"] == pytest.approx([1e-4, -2e-4], rel=EXACT)
    assert found["U"] == pytest.approx(math.hypot(0.2e-3, 0.6e-3), rel=EXACT)


def test_a_still_stretch_gives_the_drift(tmp_path):
    lead = np.arange(-200, 0) / FPS
    both = np.concatenate([lead, T])
    columns = swim(t=both)
    still = both < 0.0
    for key, at, v in (("x [mm]", 5.0, 0.05), ("y [mm]", 7.0, 0.0)):
        columns[key] = np.where(still, at, columns[key]) + v * both
    found = figures(write(tmp_path / "swim.csv", columns), "--f", 1, "--axis", 0, "--still", "-4", "-0.01")
    assert found["drift"] == pytest.approx([0.05e-3, 0.0], rel=EXACT, abs=1e-12)
    assert found["U"] == pytest.approx(0.3e-3, rel=EXACT) and found["frames"] == N


def test_leading_cycles_are_trimmed_as_asked(track):
    found = figures(track, "--f", 1, "--trim", 3)
    assert (
        found["trimmed"] == 3
        and found["frames"] == N - 3 * FPS
        and found["cycles"] == pytest.approx(7.0, rel=1e-9)
    )


# ---- reversibility


@pytest.fixture
def control(tmp_path):
    """A body that goes nowhere: 1 mm to either side along x, white noise of 0.05 mm."""
    rng = np.random.default_rng(4)
    x, y = np.sin(2.0 * np.pi * F * T) + rng.normal(0, 0.05, N), rng.normal(0, 0.05, N)
    return write(tmp_path / "control.csv", {"t": T, "x [mm]": x, "y [mm]": y})


def test_a_path_that_closes_says_how_well(control):
    found = figures(control, "--f", 1, "--axis", 0)
    closure = found["closure"]
    # 2 mm by construction, known from the fit to 0.05 mm sqrt(8/500) at two ends
    assert (
        found["p_zero"] > 0.05 and closure["closes"] and closure["excursion"] == pytest.approx(2e-3, rel=0.01)
    )
    assert closure["ratio"] == pytest.approx(found["net_per_cycle"] / found["excursion"], rel=1e-9)
    bound = max(abs(found["U_low"]), abs(found["U_high"])) * 1.0 / found["excursion"]
    assert closure["bound"] == pytest.approx(bound, rel=1e-9)
    # straight line under white noise: u(slope) = sigma sqrt(12 / (n T^2)); beat and unknown noise add to it
    floor = 0.05e-3 * math.sqrt(12.0 / (N * 10.0**2))
    assert 1.0 < closure["detection_limit"] * 2e-3 / (1.96 * floor) < 2.0
    (said,) = [
        line
        for line in run(control, "--f", 1, "--axis", 0).stdout.splitlines()
        if line.startswith("  closes")
    ]
    words, percent = "no net motion larger than ", said.split()[6]
    assert words in said and said.split()[7:13] == ["%", "of", "the", "excursion", "at", "95"]
    assert 100.0 * bound <= float(percent) < 100.0 * bound * 1.1  # two figures, rounded up
    assert f"(detection limit {100 * closure['detection_limit']:.2g} %)" in said


def test_a_swimmer_does_not_close(track):
    assert not [line for line in run(track, "--f", 1).stdout.splitlines() if line.startswith("  closes")]
    closure = figures(track, "--f", 1)["closure"]
    assert not closure["closes"] and closure["ratio"] == pytest.approx(0.5, rel=1.4e-3)  # 0.5 mm of 1 mm


# ---- free paths


def walk(path, speed, D=0.2, D_r=0.3, n=4000, dt=0.05, seed=2):
    """An active Brownian particle in the plane (Howse et al., PRL 99:048102 (2007)): um, s."""
    rng = np.random.default_rng(seed)
    heading = np.cumsum(math.sqrt(2.0 * D_r * dt) * rng.normal(size=n))
    steps = speed * dt * np.array([np.cos(heading), np.sin(heading)]) + math.sqrt(2.0 * D * dt) * rng.normal(
        size=(2, n)
    )
    x, y = np.cumsum(steps, axis=1)
    return write(path, {"t": dt * np.arange(n), "x [um]": x, "y [um]": y})


def test_a_free_path_says_whether_it_swims(tmp_path):
    found = figures(walk(tmp_path / "active.csv", 5.0))
    path = found["free_path"]
    assert found["f_beat"] is None and found["net_per_cycle"] is None and found["closure"] is None
    for key, true in (("D", 0.2e-12), ("v", 5e-6), ("tau", 1.0 / 0.3)):
        assert abs(path[key] - true) < 3.0 * path[f"u_{key}"] < true
    assert path["Pe"] == pytest.approx(path["v"] * math.sqrt(path["tau"] / path["D"]), rel=1e-9)
    said = run(tmp_path / "active.csv").stdout
    assert "swims at" in said and "forgets its direction in" in said and "Peclet number" in said
    assert "none seen; probability of no motion" in said


def test_what_diffuses_is_not_called_swimming(tmp_path):
    path = figures(walk(tmp_path / "passive.csv", 0.0))["free_path"]
    assert path["v"] is None and path["tau"] is None and path["Pe"] is None
    assert abs(path["D"] - 0.2e-12) < 3.0 * path["u_D"]
    assert "diffusion explains it, no swimming seen" in run(tmp_path / "passive.csv").stdout


# ---- forms


def test_the_table_is_read_at_the_bench(tmp_path):
    by = 0.004
    columns = swim(unit="px", by=by) | {}
    path = write(tmp_path / "swim.csv", columns)
    said = run(
        path, "--scale", "4.00(4) um/px", "--f", 1, "--axis", "53.130102", "--drift", "3.0(5),4.0(5) um/s"
    ).stdout
    lines = {line[2:].partition("  ")[0].strip(): line for line in said.splitlines()[1:]}
    assert said.splitlines()[0] == "swim.csv"
    assert "0.495(5) mm/s" in lines["speed"] and "axis 53.1 deg, as given" in lines["speed"]
    assert "0.485 to 0.505 mm/s" in lines["speed"].replace("0.4852", "0.485").replace("0.5048", "0.505")
    assert "1 Hz as given, 10.0 cycles" in lines["beat"]
    assert "0.500(5) mm along the axis" in lines["amplitude"]
    assert "0.495(5) mm; probability of none < 1e-6" in lines["net a cycle"]
    assert "3.0(5) um/s, 4.0(5) um/s taken off" in lines["drift"]
    assert "nothing" in lines["left out"] and "from cycle to cycle" in lines["steadiness"]
    assert "500 frames read" in said and "scale 4.00(4) um/px" in said


def test_what_was_left_out_is_said(tmp_path):
    columns = {k: v.copy() for k, v in swim().items()}
    columns["x [mm]"][100] += 3.0
    columns["x [mm]"][130] = np.nan
    kept = np.setdiff1d(np.arange(N), [200, 201, 202, 300])
    order = np.concatenate([kept[:50], [49], kept[50:]])
    path = write(tmp_path / "swim.csv", {k: v[order] for k, v in columns.items()})
    said = run(path, "--f", 1).stdout
    assert "1 outlier, 5 lost frames in 3 gaps, 1 duplicate, 1 unreadable row" in said
    assert "1 cells of x hold no number" in said


def test_csv_holds_the_same_figures(track):
    table = list(csv.DictReader(io.StringIO(run(track, "--f", 1, "--as", "csv").stdout)))
    found = figures(track, "--f", 1)
    assert len(table) == 1 and table[0]["track"] == "swim.csv"
    for column, value in (("U [m/s]", found["U"]), ("u_U [m/s]", found["u_U"]), ("axis_x", found["axis"][0]), ("axis_y", found["axis"][1]),
                          ("A_tip [m]", found["A_tip"]), ("drift_y [m/s]", 0.0), ("frames", N),
                          ("steadiness_u_trend [m/s2]", found["steadiness"]["u_trend"]),
                          ("closure_ratio", found["closure"]["ratio"]),
                          ("slowest_cycle [m/s]", min(found["steadiness"]["per_cycle"]))):  # fmt: skip
        assert float(table[0][column]) == value


# ---- many tracks


@pytest.fixture
def folder(tmp_path):
    for i in range(6):
        write(tmp_path / "many" / f"s-{i}.csv", swim(vx=0.1 * i, vy=0.0))
    (tmp_path / "many" / "notes.md").write_text("not a track")
    return tmp_path / "many"


def test_a_folder_gives_a_list_in_order_whatever_the_processes(folder):
    one, two = (figures(folder, "--f", 1, "--axis", 0, "--jobs", n) for n in (1, 2))
    assert one == two
    assert [row["track"] for row in one] == [f"s-{i}.csv" for i in range(6)]
    assert [row["U"] for row in one] == pytest.approx([1e-4 * i for i in range(6)], rel=EXACT, abs=1e-12)
    assert list(one[0])[1 : 1 + len(KEYS)] == KEYS


def test_tracks_come_in_the_order_given(folder):
    found = figures(folder / "s-4.csv", folder / "s-1.csv", "--f", 1, "--axis", 0)
    assert [row["track"] for row in found] == ["s-4.csv", "s-1.csv"]
    assert isinstance(figures(folder / "s-4.csv", "--f", 1), dict)


def test_files_of_one_name_go_by_their_paths(folder, tmp_path):
    write(tmp_path / "more" / "s-1.csv", swim())
    found = figures("many/s-1.csv", "more/s-1.csv", "many/s-2.csv", "--f", 1)
    assert [row["track"] for row in found] == ["many/s-1.csv", "more/s-1.csv", "s-2.csv"]


def test_a_bad_track_is_said_and_the_others_come(folder):
    (folder / "s-2.csv").write_text("t,a,b\n1,2,3\n")
    (folder / "s-4.csv").write_bytes(b"\0" * 100)
    done = run(folder, "--f", 1, "--axis", 0, "--as", "json", code=1)
    assert [row["track"] for row in json.loads(done.stdout)] == ["s-0.csv", "s-1.csv", "s-3.csv", "s-5.csv"]
    assert done.stderr.splitlines() == [
        "s-2.csv, x: the track has no column x; it has 't', 'a', 'b'; say which one it is.",
        "s-4.csv: is neither text nor Parquet; export it as CSV, UTF-8.",
    ]
    table = run(folder, "--f", 1, "--axis", 0, code=1).stdout.splitlines()
    assert len(table) == 5 and table[0].startswith("track") and table[4].startswith("s-5.csv")


# ---- refused


@pytest.mark.parametrize(("words", "said"), [
    (["none.csv"], "none.csv: there is no such file."),
    (["swim.csv", "--f", "1 kg"], "f '1 kg': kg is a mass, and a frequency is needed"),
    (["swim.csv", "--f", "0"], "f '0': a frequency must be greater than zero."),
    (["swim.csv", "--f", "0.2"], "swim.csv, t '2 cycles': at least three cycles are needed"),
    (["swim.csv", "--scale", "3(1) um/px"], "swim.csv, scale '3(1) um/px': x is in mm already; leave the scale out."),
    (["swim.csv", "--axis", "north"], "axis 'north': cannot be read as an angle"),
    (["swim.csv", "--drift", "1 um/s"], "drift '1 um/s': cannot be read as a velocity"),
    (["swim.csv", "--columns", "x=X"], "swim.csv, x 'X': the track has no such column; it has 't [s]', 'x [mm]', 'y [mm]'"),
    (["swim.csv", "--columns", "X_pos"], "columns 'X_pos': is not role=column"),
    (["swim.csv", "--trim", "some"], "swim.csv, trim 'some': 'auto' or a number of cycles is needed"),
    (["swim.csv", "--drift", "bad.csv"], "drift bad.csv, x: the track has no column x"),
    (["empty"], "this folder holds no track; name them .csv, .tsv, .txt, .parquet."),
])  # fmt: skip
def test_refused_in_one_sentence(track, tmp_path, words, said):
    (tmp_path / "bad.csv").write_text("t,a,b\n1,2,3\n")
    (tmp_path / "empty").mkdir()
    done = run(*words, code=1)
    assert done.stdout == "" and len(done.stderr.splitlines()) == 1 and said in done.stderr


@pytest.mark.parametrize("words", [
    [], ["swim.csv", "--run", "R-1", "--by-name"], ["swim.csv", "--book", "b.db"], ["swim.csv", "--confirm"], ["swim.csv", "swim.csv", "--run", "R-1"],
    ["swim.csv", "--as", "xml"], ["swim.csv", "--jobs", "0"], ["swim.csv", "--still", "1"],
])  # fmt: skip
def test_wrong_usage(track, words):
    run(*words, code=2)


# ---- attached to runs


@pytest.fixture
def bench(tmp_path, monkeypatch):
    """A book with a rig of 4.0(1) um/px at 50 frames a second, and two runs at 1 Hz."""
    path = tmp_path / "swims.db"
    with Book.new(path) as book:
        book.stock("fluid", code="oil", kind="silicone-oil", grade="5000 cSt")
        book.stock(
            "swimmer", code="reed", form="flexible tail", L_body="34 mm", L_tail="30.0(1) mm", d="1.00(1) mm"
        )
        book.stock("rig", code="coil", scale="4.0(1) um/px", fps="50 1/s")
        for day in (1, 2):
            book.record(
                swimmer="reed",
                fluid="oil",
                rig="coil",
                f="1.00(1) Hz",
                U="0.4 mm/s",
                T="22 degC",
                at=f"2026-03-0{day}T10:00",
            )
    return path


@pytest.fixture
def frames(tmp_path):
    """The same swim in frames and pixels, named by the first run."""
    columns = swim(unit="px", by=0.004, time="frame", tip=True) | {"frame": np.arange(N)}
    return write(tmp_path / "R-0001.csv", columns)


def sheet(path, code):
    with Book.open(path) as book:
        return book.sheet(code)


def test_a_track_is_attached_with_what_run_and_rig_say(bench, frames):
    found = figures(frames, "--run", "R-0001", "--book", bench)
    assert found["f_beat"] == 1.0 and found["U"] == pytest.approx(0.5e-3, rel=EXACT)
    of_run = sheet(bench, "R-0001")
    assert of_run.values["U"] == pytest.approx(0.5e-3, rel=1e-4)  # written with three digits of u
    assert of_run.u["U"] == pytest.approx(0.025 * 0.5e-3, rel=0.01)
    assert of_run.values["A_tip"] == pytest.approx(2.0e-3, rel=1e-3)
    assert sheet(bench, "R-0002").values["U"] == pytest.approx(0.4e-3, rel=1e-9)
    with Book.open(bench) as book:
        assert book.check() == []


def test_what_is_typed_goes_before_run_and_rig(bench, frames):
    found = figures(frames, "--run", "R-0001", "--book", bench, "--scale", "8.0(1) um/px", "--fps", "25", "--f", "0.5 Hz",
                    "--axis", "53.13010235415598", "--drift", "0.03(0),0.04(0) mm/s")  # fmt: skip
    assert found["f_beat"] == 0.5 and found["axis_from"] == "given"
    assert found["U"] == pytest.approx(0.45e-3, rel=EXACT)  # twice the length, half the rate, less the drift


def test_a_drift_track_of_a_run_takes_the_rigs_scale(bench, frames, tmp_path):
    tracer = swim(vx=0.1, vy=-0.2, beat=0.0, unit="px", by=0.004)
    drift = write(
        tmp_path / "tracer.csv", {"frame": np.arange(N), "x": tracer["x [px]"], "y": tracer["y [px]"]}
    )
    found = figures(frames, "--run", "R-0001", "--book", bench, "--drift", drift)
    assert found["drift"] == pytest.approx([1e-4, -2e-4], rel=EXACT)


def test_a_track_of_a_run_says_what_was_read_as_one_without_does(bench, tmp_path):
    columns = swim(unit="px", by=0.004, time="frame", tip=True) | {"frame": np.arange(N)}
    for role, at in (("x [px]", 130), ("x [px]", 131), ("tip_x [px]", 140)):
        columns[role][at] = np.nan
    kept = np.setdiff1d(np.arange(N), [200, 201, 202, 300])
    path = write(tmp_path / "R-0001.csv", {k: v[kept] for k, v in columns.items()})
    plain = run(path, "--scale", "4.0(1) um/px", "--fps", 50, "--f", "1 Hz").stdout.splitlines()
    of_run = run(path, "--run", "R-0001", "--book", bench).stdout.splitlines()
    assert of_run[:-1] == plain and of_run[-1].strip() == "file         kept with R-0001"
    told = "\n".join(of_run)
    assert "2 cells of x hold no number" in told and "1 cells of tip_x hold no number" in told
    assert "6 lost frames in 3 gaps, 2 unreadable rows" in told and "496 frames read" in told
    # many at once: what was left out stands in each line
    assert "6 lost frames in 3 gaps, 2 unreadable rows" in run(path.parent, "--by-name", "--book", bench).stdout


def test_a_drift_track_of_a_run_is_named_on_it(bench, frames, tmp_path):
    write(tmp_path / "tracer.csv", swim(vx=0.1, vy=-0.2, beat=0.0))
    run(frames, "--run", "R-0001", "--book", bench, "--drift", "tracer.csv")
    settings = sheet(bench, "R-0001").track.settings
    assert settings["drift_from"] == "tracer.csv" and settings["drift"][0] == pytest.approx([1e-4, -2e-4], rel=EXACT)
    with Book.open(bench) as book:
        assert book.check() == [], "the velocity is kept, so it reduces again without the tracer"


def test_a_track_that_is_far_off_wants_a_confirmation(bench, tmp_path):
    """As `log` and `amend` do: book/plausibility.py, five times outside this swimmer's runs."""
    with Book.open(bench) as book:
        for i in range(3):
            book.record(swimmer="reed", fluid="oil", rig="coil", f="1.00(1) Hz", U="0.4 mm/s", T="22 degC", at=f"2026-03-05T10:0{i}")
    columns = swim(vx=30.0, vy=40.0, unit="px", by=0.004, time="frame") | {"frame": np.arange(N)}
    path = write(tmp_path / "fast.csv", columns)
    done = run(path, "--run", "R-0001", "--book", bench, code=1)
    assert done.stdout == "" and len(done.stderr.splitlines()) == 1
    assert done.stderr.startswith("fast.csv: Re = ") and "U = 50 mm/s is 125 times the largest of this swimmer's runs" in done.stderr
    assert done.stderr.endswith("Nothing was attached; repeat with --confirm if this is right.\n")
    assert sheet(bench, "R-0001").track is None
    assert "kept with R-0001" in run(path, "--run", "R-0001", "--book", bench, "--confirm").stdout
    assert "confirmed" in sheet(bench, "R-0001").marks["U"]


def test_the_book_may_be_left_out(bench, frames, monkeypatch):
    monkeypatch.setenv("LABBOOK_BOOK", str(bench))
    assert "kept with R-0001" in run(frames, "--run", "R-0001").stdout


def test_tracks_find_their_runs_by_name(bench, frames, tmp_path):
    folder = tmp_path / "tracks"
    folder.mkdir()
    for name in ("R-0001.csv", "R-0002.csv", "R-0099.csv"):
        (folder / name).write_bytes(frames.read_bytes())
    (folder / "R-0002.csv").write_bytes(frames.read_bytes() + b"500,0,0,0,0\n")
    done = run(folder, "--by-name", "--book", bench, "--as", "json", code=1)
    assert [row["track"] for row in json.loads(done.stdout)] == ["R-0001.csv", "R-0002.csv"]
    assert len(done.stderr.splitlines()) == 1 and done.stderr.startswith("R-0099.csv, run 'R-0099':")
    assert [sheet(bench, c).values["U"] for c in ("R-0001", "R-0002")] == pytest.approx(
        [0.5e-3] * 2, rel=1e-4
    )


@pytest.mark.parametrize("words", [
    ["R-0001.csv", "--run", "R-0099"], ["R-0001.csv", "--run", "R-0001", "--f", "0.1"], ["none.csv", "--run", "R-0001"],
    ["R-0001.csv", "--run", "R-0001", "--scale", "4"], ["R-0001.csv", "--run", "R-0001", "--columns", "x=X"],
    ["R-0001.csv", "--run", "R-0001", "--drift", "1 um/s"],
])  # fmt: skip
def test_a_refused_track_leaves_the_book_as_it_was(bench, frames, words):
    before = bench.read_bytes()
    done = run(*words, "--book", bench, code=1)
    assert len(done.stderr.splitlines()) == 1
    assert sheet(bench, "R-0001").values["U"] == pytest.approx(0.4e-3, rel=1e-9)
    assert bench.read_bytes() == before


@pytest.mark.parametrize("error", [np.linalg.LinAlgError("singular"), ZeroDivisionError(), ValueError("no root")])
def test_a_track_that_no_fit_bears_is_said_and_the_others_come(folder, monkeypatch, error):
    real = tracks.reduce

    def breaks(**options):
        if options["x"][0] == options["x"][1]:
            raise error
        return real(**options)

    write(folder / "s-2.csv", swim(vx=0.0, vy=0.0, beat=0.0))
    monkeypatch.setattr(tracks, "reduce", breaks)
    done = run(folder, "--f", 1, "--axis", 0, "--as", "json", "--jobs", 1, code=1)
    assert len(json.loads(done.stdout)) == 5
    assert done.stderr == "s-2.csv: no motion can be fitted to these positions; look at the path.\n"
