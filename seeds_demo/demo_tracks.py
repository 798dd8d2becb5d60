"""Invented tracks of some of the year's runs, a file each, as the group's trackers would write them."""

import csv
import io
from dataclasses import dataclass
from math import cos, radians, sin

import numpy as np
from demo_shelf import RIGS, SWIMMERS

WIDE, HIGH = 2448, 2048  # px of every camera
FRAMES = 240, 500
MOST_CYCLES = 12.4
WOBBLE = 0.8  # correlation of a frame's wobble with that of the frame before
BY_CODE = {swimmer.code: swimmer for swimmer in SWIMMERS}
CAMERAS = {rig["code"]: [float(rig[key].split("(")[0]) for key in ("scale", "fps")] for rig in RIGS}


@dataclass(frozen=True)
class Habit:
    """How a tracker writes.

    unit: 'px' or 'mm'; names: (role, header) pairs where headers are others, to be asked for; order: 'rising'
    or 'shuffled'; lost: share of frames it lost, half of them rows with empty cells; drift: (vx, vy, u of
    each) in um/s, of the bath in the picture.
    """

    unit: str = "px"
    separator: str = ","
    decimal: str = "."
    names: tuple = ()
    order: str = "rising"
    lost: float = 0.0
    drift: tuple = ()


PLAIN = Habit()
COMMA = Habit(separator=";", decimal=",")
TIMES = Habit(unit="mm")
SHUFFLED = Habit(order="shuffled")
GAPS = Habit(lost=0.03)
DRIFTING = Habit(drift=(1.6, -0.9, 0.12))
RENAMED = Habit(names=(
    ("frame", "Slice"), ("x", "X_head"), ("y", "Y_head"), ("tip_x", "X_end"), ("tip_y", "Y_end"),
))  # fmt: skip

SWIMMING = (
    # flexible tails
    "R-0012", "R-0042", "R-0059", "R-0065", "R-0076", "R-0113", "R-0126", "R-0144", "R-0180", "R-0186",
    "R-0222", "R-0233", "R-0253", "R-0261", "R-0300", "R-0388", "R-0395", "R-0409", "R-0447", "R-0481",
    "R-0502", "R-0515", "R-0531", "R-0625", "R-0645", "R-0711", "R-0736", "R-0819", "R-0844", "R-0916",
    "R-0048", "R-0238", "R-0457", "R-0472", "R-0612",  # helices
    "R-0322", "R-0554", "R-0796",  # undulating bodies
)  # fmt: skip
RIGID = "R-0031", "R-0157", "R-0868", "R-0893"
HINGED = "R-0191", "R-0760"
HABITS = {
    "R-0233": COMMA, "R-0481": COMMA, "R-0625": COMMA, "R-0186": TIMES, "R-0395": TIMES, "R-0144": SHUFFLED,
    "R-0868": SHUFFLED, "R-0300": GAPS, "R-0472": GAPS, "R-0076": DRIFTING, "R-0736": RENAMED,
}  # fmt: skip
ALONG_ITS_PATH = "R-0457", "R-0612"  # nobody gave an axis


def files(rows, seed):
    """{file name: text} of the tracks of a year's rows, in the order of their codes, and of settings.csv."""
    found, settings = {}, [("file", "axis [deg]", "drift", "columns")]
    for code in sorted((*SWIMMING, *RIGID, *HINGED)):
        serial = int(code.removeprefix("R-"))
        habit, rng = HABITS.get(code, PLAIN), np.random.default_rng([seed, serial])
        axis, columns = _filmed(rows[serial - 1], habit, rng)
        found[f"{code}.csv"] = _written(columns, habit, CAMERAS[rows[serial - 1]["rig"]], rng)
        asked = ",".join(f"{role}={name}" for role, name in habit.names if role in columns)
        settings.append((f"{code}.csv", "" if code in ALONG_ITS_PATH else axis, _typed(habit.drift), asked))
    found["settings.csv"] = _table(settings, ",")
    return found


def _typed(drift):
    """A drift as one types it, u in the last two digits: 1.60(12),-0.90(12) um/s."""
    if not drift:
        return ""
    vx, vy, u = drift
    return f"{vx:.2f}({round(100 * u)}),{vy:.2f}({round(100 * u)}) um/s"


def write(folder, rows, seed):
    """Write the files into a folder, and take away what stood there under another run's name."""
    folder.mkdir(exist_ok=True)
    wanted = files(rows, seed)
    for old in folder.glob("R-*.csv"):
        if old.name not in wanted:
            old.unlink()
    for name, text in wanted.items():
        (folder / name).write_bytes(text.encode())


def _filmed(row, habit, rng):
    """(axis in degrees, {role: values}) of a run: frame, px."""
    swimmer, (U, A_tip, f) = BY_CODE[row["swimmer"]], row["truth"]
    scale, fps = CAMERAS[row["rig"]]  # um/px
    px = 1e6 / scale
    frame = _frames(U * px, f, fps, _behind(swimmer) * px if A_tip else 0.0, rng)
    t, phase = frame / fps, rng.uniform(0.0, 2.0 * np.pi)
    beat = 2.0 * np.pi * f * t + phase
    yaw = _yaw(swimmer, A_tip) * px
    along = U * px * t + yaw * (0.25 * np.sin(beat + 0.9) + 0.15 * np.sin(2.0 * beat))
    points = {"": (along, yaw * np.sin(beat))}
    if A_tip:
        sweep = 0.5 * A_tip * px * np.sin(beat - 2.0)
        points["tip_"] = (along - _behind(swimmer) * px, yaw * np.sin(beat) + sweep)
    axis = int(rng.integers(-14, 15)) + 180 * int(rng.integers(2))
    e, noise = (cos(radians(axis)), sin(radians(axis))), rng.uniform(0.15, 0.30)
    placed = {"frame": frame}
    for prefix, (ahead, across) in points.items():
        placed[f"{prefix}x"] = e[0] * ahead - e[1] * across
        placed[f"{prefix}y"] = e[1] * ahead + e[0] * across
    for which, middle, v in (("x", 0.5 * WIDE, 0), ("y", 0.5 * HIGH, 1)):
        roles = [role for role in placed if role.endswith(which)]
        low, high = (end([placed[role] for role in roles]) for end in (np.min, np.max))
        moved = middle - 0.5 * (low + high)
        if habit.drift:
            moved = moved + habit.drift[v] / scale * (t - t[-1] / 2.0)
        for role in roles:
            placed[role] = placed[role] + moved + _camera(len(t), noise, rng)
    return axis, placed


def _frames(speed, f, fps, length, rng):
    """Numbers of the frames that were tracked: every n-th of a slow beat; speed in px/s, length in px."""
    room = (0.97 * WIDE - length) / speed * f if speed > 0.0 else MOST_CYCLES
    cycles = min(rng.uniform(8.2, MOST_CYCLES), max(room, 6.0))
    cycles = min(max(cycles, 1.02 * FRAMES[0] * f / fps), MOST_CYCLES)
    every = int(np.ceil(cycles / f * fps / (0.98 * FRAMES[1])))
    return np.arange(0, int(cycles / f * fps), every)


def _behind(swimmer):
    """Distance from the tracked point of the head to the tip, m."""
    return 1e-3 * (swimmer.L_tail + swimmer.b if swimmer.L_tail else swimmer.L_body)


def _yaw(swimmer, A_tip):
    """How far the tracked point beats to either side, m."""
    if A_tip:
        return 0.06 * A_tip
    return 1e-3 * (0.15 * swimmer.helix[0] if swimmer.helix else 0.03 * swimmer.L_tail)


def _camera(n, noise, rng):
    """Noise of the camera, px, and a little wobble that outlasts a frame."""
    steps, wobble = rng.normal(0.0, 0.4 * noise * (1.0 - WOBBLE**2) ** 0.5, n), np.empty(n)
    last = rng.normal(0.0, 0.4 * noise)
    for i, step in enumerate(steps):
        wobble[i] = last = WOBBLE * last + step
    return wobble + rng.normal(0.0, noise, n)


def _written(columns, habit, camera, rng):
    """A track's text in a tracker's habit."""
    frame = columns["frame"]
    texts = {"frame": [str(n) for n in frame]}
    texts |= {role: [f"{v:.2f}" for v in values] for role, values in columns.items() if role != "frame"}
    heads = dict(habit.names)
    if habit.unit == "mm":
        scale, fps = camera
        texts = {"t [s]": [f"{n / fps:.4f}" for n in frame]}
        lengths = {k: 1e-3 * scale * values for k, values in columns.items() if k != "frame"}
        texts |= {f"{k} [mm]": [f"{v:.2f}" for v in values] for k, values in lengths.items()}
    rows = [list(cells) for cells in zip(*texts.values(), strict=True)]
    if habit.lost:
        lost = sorted(rng.choice(np.arange(1, len(rows) - 1), round(habit.lost * len(rows)), replace=False))
        for i in lost[1::2]:
            rows[i][1:] = [""] * (len(rows[i]) - 1)
        rows = [row for i, row in enumerate(rows) if i not in lost[::2]]
    if habit.order == "shuffled":
        rows = [rows[i] for i in rng.permutation(len(rows))]
    rows = [[cell.replace(".", habit.decimal) for cell in row] for row in rows]
    return _table([[heads.get(role, role) for role in texts], *rows], habit.separator)


def _table(rows, separator):
    text = io.StringIO()
    csv.writer(text, delimiter=separator, lineterminator="\n").writerows(rows)
    return text.getvalue()
