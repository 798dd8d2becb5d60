"""The speed budget of tracks as ratios inside one run: a long track against reading its CSV, many tracks on two cores."""

import numpy as np
import pandas as pd
import pytest
from click.testing import CliRunner
from measured import RUNS, noted, timed

from labbook.cli import main
from labbook.exchange.track_files import read_track
from labbook.physics import tracks

FRAMES = RUNS  # of the long track
TRACKS = max(RUNS // 1000, 8)
SHORT = 2000  # frames of each of many


def swim(path, frames, seed, speed=0.4):
    """A swimmer at 0.4 mm/s along x with a beat of 1 Hz at 30 frames a second, wobble-free white noise of 0.1 mm."""
    rng = np.random.default_rng(seed)
    t = np.arange(frames) / 30.0
    x = speed * t + np.cos(2 * np.pi * t) + 0.3 * np.cos(4 * np.pi * t + 1.0) + rng.normal(0, 0.1, frames)
    y = 2.0 * np.sin(2 * np.pi * t) + rng.normal(0, 0.1, frames)
    pd.DataFrame({"t [s]": t, "x [mm]": x, "y [mm]": y}).to_csv(path, index=False)
    return path


@pytest.mark.parametrize(
    "given", [{"f": 1.0, "axis": (1.0, 0.0)}, {}], ids=["f and axis given", "nothing given"]
)
def test_a_long_track(tmp_path, given):
    path = swim(tmp_path / "long.csv", FRAMES, 1)
    found = []
    theirs = timed(lambda: pd.read_csv(path), 5)
    ours = timed(lambda: found.append(tracks.reduce(**read_track(path).keywords(), **given)), 3)
    theirs = min(theirs, timed(lambda: pd.read_csv(path), 5))  # a busy machine is no excuse
    assert abs(found[0].U - 0.4e-3) < 5 * found[0].u_U and found[0].f_beat == pytest.approx(1.0, rel=1e-5)
    noted(
        f"read and reduce {FRAMES} frames, {', '.join(given) or 'nothing'} given : pandas reads the CSV",
        ours,
        theirs,
        10,
    )


def test_reading_a_long_track(tmp_path):
    path = swim(tmp_path / "long.csv", FRAMES, 1)
    theirs, ours = timed(lambda: pd.read_csv(path), 5), timed(lambda: read_track(path), 5)
    noted(f"read {FRAMES} frames into SI : pandas reads the CSV", ours, theirs, 3)


def test_many_tracks_on_two_cores(tmp_path):
    """Needs a machine with two cores that have nothing else to do."""
    folder = tmp_path / "tracks"
    folder.mkdir()
    for i in range(TRACKS):
        swim(folder / f"s-{i:04d}.csv", SHORT, i)
    said = {}

    def reduced(jobs):
        done = CliRunner().invoke(
            main, ["reduce", str(folder), "--f", "1", "--axis", "0", "--as", "csv", "--jobs", str(jobs)]
        )
        assert done.exit_code == 0, done.output
        said[jobs] = done.stdout

    one, two = timed(lambda: reduced(1), 1), timed(lambda: reduced(2), 1)
    assert said[1] == said[2] and said[1].count("\n") == TRACKS + 1
    noted(f"{TRACKS} tracks of {SHORT} frames, two workers : one worker", two, one, 1 / 1.5)
