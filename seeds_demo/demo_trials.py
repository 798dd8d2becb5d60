"""The invented year at the bench: sessions, the trials of each, and what was typed."""

from datetime import date, datetime, time, timedelta
from math import pi

import demo_cells as cells
import numpy as np
from demo_shelf import FIRST, FLUIDS, LAST, MATERIALS, SWIMMERS

from labbook.physics import helices, magnets, tails, undulation, walls

PEOPLE = ("knot", "wren", "sable", "pike")
BY_CODE = {thing.code: thing for thing in (*FLUIDS, *MATERIALS, *SWIMMERS)}
OILS = ("gly96-a", "sil1000-a", "sil1000-b", "sil5000-a", "sil12500-a", "syrup-a", "gly88-a", "gly88-b",
        "sil350-a")
CUT = {swimmer.parent: swimmer.built for swimmer in SWIMMERS if swimmer.parent}
F_LOW, F_HIGH = 0.04, 6.0  # Hz: five beats in two minutes, and what the coils follow
WHYS = ("bubble on head", "tail touched the wall", "camera stopped half way", "coil current tripped",
        "magnet came loose", "wrong channel driven")
NOTES = ("restarted camera", "slow drift upwards", "refocused", "oil stirred an hour before",
         "second clip used", "door open, draught", "tail slightly curved at rest")
FRESH = 3.6  # how far outside its swimmer's earlier span a value may fall; the notebook warns at 5


def room_temperature(moment, rng):
    """A room that follows the season and the day, K."""
    season = 2.0 * np.cos(2.0 * pi * (moment.timetuple().tm_yday - 205) / 365.0)
    daily = 0.7 * np.sin(2.0 * pi * (moment.hour + moment.minute / 60.0 - 10.0) / 24.0)
    return 273.15 + float(np.clip(22.0 + season + daily + 0.35 * rng.standard_normal(), 19.0, 25.0))


def flexible_sp(swimmer, fluid, f, T, day):
    """House sperm number with the true viscosity and modulus."""
    zeta_n, _ = swimmer.zetas(fluid.mu(T, day))
    EI = BY_CODE[swimmer.material].modulus(day) * swimmer.area_moment()
    return float(swimmer.L_tail * 1e-3 * (zeta_n * 2.0 * pi * f / EI) ** 0.25)


def true_motion(swimmer, fluid, f, T, day, theta0, A_tip=None):
    """(U, A_tip) in m/s and m without any noise; A_tip is given for undulating bodies, None where unseen."""
    mu, L, b = fluid.mu(T, day), swimmer.L_tail * 1e-3, swimmer.b * 1e-3
    if swimmer.form == "flexible tail":
        zeta_n, zeta_t = swimmer.zetas(mu)
        EI = BY_CODE[swimmer.material].modulus(day) * swimmer.area_moment()
        given = dict(drive="free_head_angle", L=L, a=1e-3 * swimmer.size[0] / 2.0, EI=EI, mu=mu, f=f, b=b,
                     theta0=theta0, zeta_n=zeta_n, zeta_t=zeta_t)
        return float(tails.free_speed(**given)), float(tails.tip_excursion(**given))
    if swimmer.form == "helix":
        R, pitch = (1e-3 * x for x in swimmer.helix)
        return float(helices.free_speed(drive="field", omega=2.0 * pi * f, R=R, pitch=pitch, L=L, b=b, mu=mu,
                                        a=swimmer.size[0] / 2e3)), None
    if swimmer.form == "undulating":
        U = undulation.swimming_speed(omega=2.0 * pi * f, A_tip=A_tip, L_body=swimmer.L_body * 1e-3,
                                      nu=mu / fluid.density(T))
        return float(U), A_tip
    return 0.0, None


def step_out_frequency(swimmer, fluid, T, day, B):
    """Hz, for a helix with its head in a rotating field."""
    mu, (R, pitch) = fluid.mu(T, day), (1e-3 * x for x in swimmer.helix)
    _, _, A22 = helices.resistance(R=R, pitch=pitch, L=swimmer.L_tail * 1e-3, a=swimmer.size[0] / 2e3, mu=mu)
    turn = walls.sphere_rotational_drag(mu=mu, b=swimmer.b * 1e-3)
    return float(magnets.step_out(m_mag=swimmer.m_mag, B=B, resistance=A22 + turn)) / (2.0 * pi)


class Bench:
    """Makes runs in the order of time, and keeps each value near what its swimmer did before."""

    def __init__(self, rng):
        self.rng = rng
        self.rows = []
        self.seen = {}
        self.free = datetime.min

    def familiar(self, swimmer, U, Re, Sp):
        """Whether a new value would raise no eyebrow, given the kept runs of this swimmer so far."""
        earlier = self.seen.get(swimmer.code, [])
        spans = [(abs(Re), [row[1] for row in earlier])]
        for window in (1.15, 1.2, 1.25):
            near = [row[0] for row in earlier if Sp is None or row[2] / window <= Sp <= row[2] * window]
            spans.append((abs(U), near))
        for value, span in spans:
            for sizes in ([abs(x) for x in span], [x for x in span if x > 0.0]):
                if len(sizes) >= 3 and not min(sizes) / FRESH <= value <= max(sizes) * FRESH:
                    return False
        return True

    def trial(self, moment, by, swimmer, fluid, rig, f, theta0=None, series="", B=None, A_tip=None):
        """One trial; returns False, and writes nothing, where its values would look out of place.

        A row's truth, (U in m/s, A_tip in m or None, f in Hz), is for demo_tracks: no sheet has that column.
        """
        rng, day = self.rng, moment.date()
        T = self.T = self.T + 0.03 * rng.standard_normal()
        actual = None if theta0 is None else theta0 * (1.0 + 0.015 * rng.standard_normal())
        U, tip = true_motion(swimmer, fluid, f, T, day, actual, A_tip)
        relative = rng.uniform(0.03, 0.06)
        tracking = {"undulating": 8e-4, "helix": 4e-6}.get(swimmer.form, rng.uniform(2.5e-7, 6e-7))
        u_U = float(np.hypot(relative * U, tracking))
        Sp = flexible_sp(swimmer, fluid, f, T, day) if swimmer.section and swimmer.form != "helix" else None
        L_body = swimmer.L_body or swimmer.L_tail + 2.0 * swimmer.b
        for _ in range(12):
            seen = U * (1.0 + relative * rng.standard_normal()) + tracking * rng.standard_normal()
            text, seen = cells.speed(by, seen, u_U)
            Re = fluid.density(T) * seen * L_body * 1e-3 / fluid.mu(T, day)
            if abs(seen - U) > 2.2 * u_U or abs(seen) < 0.15 * u_U:
                continue
            if self.familiar(swimmer, seen, Re, Sp):
                break
        else:
            return False
        void, has_U, has_T = rng.random() < 0.03, rng.random() > 0.03, rng.random() > 0.03
        if has_U and has_T and not void:
            self.seen.setdefault(swimmer.code, []).append((seen, Re, Sp))
        row = dict(swimmer=swimmer.code, fluid=fluid.code, rig=rig, at=f"{moment:%Y-%m-%dT%H:%M}", by=by,
                   f=cells.frequency(by, f, swimmer.form == "helix"), series=series,
                   drive="field" if swimmer.form == "helix" else "", state="void" if void else "",
                   truth=(U, tip, f))
        if theta0 is not None and rng.random() > 0.04:
            row["theta0"] = cells.angle(by, theta0, 0.006)
        if has_T:
            T_read = T + 0.1 * rng.standard_normal()
            row["T"] = cells.temperature(by, T_read)
            if rng.random() < 0.06 and rig.startswith("coil"):
                row["T_end"] = cells.temperature(by, T_read + rng.uniform(0.2, 0.6))
        if has_U:
            row["U"] = text
        u_tip = max(0.03 * (tip or 0.0), 3e-5)
        if tip and tip > 5.0 * u_tip and (A_tip is not None or rng.random() < 0.35):
            row["A_tip"] = cells.shorthand(1e3 * (tip + 0.7 * u_tip * rng.standard_normal()), 1e3 * u_tip)
        if B is not None and self.reads_current:
            row["I_coil"] = f"{1e3 * B / {'coil-1': 1.12, 'coil-2': 1.04}[rig]:.2f}"
        elif B is not None:
            row["B"] = cells.plain(1e3 * B)
        if rng.random() > 0.06:
            row["h_wall"] = cells.plain(self.h_wall)
        if void:
            row["why"] = str(rng.choice(WHYS))
        elif rng.random() < 0.05:
            row["note"] = str(rng.choice(NOTES))
        self.rows.append(row)
        return True

    def pick(self, swimmers):
        """One of them, rather one that has been tried less."""
        tried = np.array([len(self.seen.get(swimmer.code, [])) for swimmer in swimmers])
        weights = (6.0 + tried) ** -1.5
        return swimmers[self.rng.choice(len(swimmers), p=weights / weights.sum())]

    def clock(self, day, n):
        """Start times of n trials in one session, a few minutes apart; sets what the session shares."""
        rng = self.rng
        start = max(self.free, datetime.combine(day, time(9, 10)))
        moment = start + timedelta(minutes=int(rng.integers(5, 90)))
        self.T = room_temperature(moment, rng)
        self.h_wall = float(rng.choice([30.0, 35.0, 40.0, 60.0]))  # mm, at least five radii of every head
        self.reads_current = rng.random() < 0.4
        for _ in range(n):
            yield moment
            moment += timedelta(minutes=int(rng.integers(4, 10)))
        self.free = moment


def on_the_shelf(day, codes):
    found = [BY_CODE[code] for code in codes]
    return [fluid for fluid in found if fluid.made <= day <= fluid.until]


def built(day, form):
    """Swimmers of a form that stand ready on a day; one that was trimmed is gone."""
    return [swimmer for swimmer in SWIMMERS
            if swimmer.form == form and swimmer.built <= day < CUT.get(swimmer.code, date.max)]


def reach(swimmer, fluid, day, Re_limit, Sp_low, Sp_wanted, Sp_high):
    """Frequencies (low, high) for a range of Sp that bench and Re_omega allow; None if short of Sp_wanted."""
    T = 295.15
    per_hertz = flexible_sp(swimmer, fluid, 1.0, T, day)
    low, useful, high = ((Sp / per_hertz) ** 4 for Sp in (Sp_low, Sp_wanted, Sp_high))
    inertia = fluid.density(T) * 2.0 * pi * (swimmer.L_tail * 1e-3) ** 2 / fluid.mu(T, day)
    low, high = max(low, F_LOW), min(high, F_HIGH, Re_limit / inertia)
    return (low, high) if high > max(2.5 * low, useful) else None


def flexible_session(bench, day, by):
    """A sweep in one fluid, a handful of repeats, or both."""
    rng = bench.rng
    limit = 0.9 if rng.random() < 0.85 else 4.0
    aim = ((0.62, 0.95, 1.9), (1.0, 1.9, 4.0), (1.3, 3.2, 8.2))[rng.choice(3, p=[0.24, 0.38, 0.38])]
    within = {}
    for fluid in on_the_shelf(day, OILS):
        thin = 12.0 if fluid.code.startswith("gly88") else limit  # nothing creeps in it at these lengths
        reached = {s: reach(s, fluid, day, thin, *aim) for s in built(day, "flexible tail")}
        within[fluid] = {s: span for s, span in reached.items() if span}
    swimmer = bench.pick(list({s: None for fluid in within for s in within[fluid]}))
    fluid = rng.choice([fluid for fluid in within if swimmer in within[fluid]])
    low, high = within[fluid][swimmer]
    theta0 = float(rng.choice([0.15, 0.20, 0.24, 0.27, 0.29]))
    B = float(rng.choice([2.0, 3.0, 4.0])) * 1e-3
    n = int(rng.integers(8, 14))
    sweep = sorted({cells.two_digits(f) for f in np.geomspace(low, high, n)})
    middle = sweep[len(sweep) // 2]
    repeats = [middle] * int(rng.integers(3, 6)) if rng.random() < 0.3 else []
    series = f"{swimmer.code} sweep {day.day} {day:%b}"
    plan = [(f, series) for f in sweep] + [(f, "") for f in repeats]
    for moment, (f, label) in zip(bench.clock(day, len(plan)), plan, strict=True):
        bench.trial(moment, by, swimmer, fluid, "coil-1", f, theta0, label, B)


def control_session(bench, day, by):
    """Rigid tails and hinged bodies: whatever they do, they should not get anywhere."""
    rng = bench.rng
    hinged = built(day, "hinged") and rng.random() < 0.4
    form, rig = ("hinged", "bench-1") if hinged else ("rigid tail", "coil-1")
    swimmer = bench.pick(built(day, form))
    fluid = rng.choice(on_the_shelf(day, ("sil1000-a", "sil5000-a", "syrup-a")))
    theta0 = float(rng.choice([0.2, 0.25, 0.29])) * (2.0 if form == "hinged" else 1.0)
    B = 3e-3 if form == "rigid tail" else None
    beats = sorted(rng.choice([0.1, 0.2, 0.3, 0.5, 0.7, 1.0, 1.4], rng.integers(4, 7), replace=False))
    for moment, f in zip(bench.clock(day, len(beats)), beats, strict=True):
        bench.trial(moment, by, swimmer, fluid, rig, float(f), theta0, "", B)


def helix_session(bench, day, by):
    """A sweep that stays below nine tenths of step-out."""
    rng = bench.rng
    swimmer = bench.pick(built(day, "helix"))
    fluid = rng.choice(on_the_shelf(day, ("sil1000-a", "gly96-a", "sil350-a", "sil5000-a")))
    B = float(rng.choice([3.0, 4.0, 5.0])) * 1e-3
    top = min(6.0, 0.85 * step_out_frequency(swimmer, fluid, 295.15, day, B))
    sweep = sorted({cells.two_digits(f) for f in np.geomspace(top / 8.0, top, int(rng.integers(6, 10)))})
    series = f"{swimmer.code} sweep {day.day} {day:%b}"
    for moment, f in zip(bench.clock(day, len(sweep)), sweep, strict=True):
        bench.trial(moment, by, swimmer, fluid, "coil-2", f, None, series, B)


def undulating_session(bench, day, by):
    """Bodies in the water tank, one amplitude, a few beat frequencies."""
    rng = bench.rng
    swimmer = bench.pick(built(day, "undulating"))
    A_tip = float(rng.choice([0.16, 0.19, 0.22])) * swimmer.L_body * 1e-3
    fluid = BY_CODE["gly60-a" if swimmer.code == "kelp-04" else "water-1"]
    beats = sorted(rng.choice([1.0, 1.4, 1.8, 2.2, 2.6, 3.0, 3.6], rng.integers(5, 7), replace=False))
    for moment, f in zip(bench.clock(day, len(beats)), beats, strict=True):
        bench.trial(moment, by, swimmer, fluid, "tank-1", float(f), A_tip=A_tip)


def at_work(day):
    away = ((date(2025, 12, 20), date(2026, 1, 4)), (date(2026, 8, 1), date(2026, 8, 16)))
    return day.weekday() < 5 and not any(first <= day <= last for first, last in away)


def runs(rng):
    """Rows of the runs sheet in the order of time."""
    bench = Bench(rng)
    day = FIRST
    while day <= LAST:
        for form, by in zip(_today(rng, day), rng.permutation(PEOPLE), strict=False):
            form(bench, day, str(by))
        day += timedelta(days=1)
    return sorted(bench.rows, key=lambda row: row["at"])


def _today(rng, day):
    if not at_work(day):
        return []
    sessions = [flexible_session] if rng.random() < 0.22 or day in (FIRST, LAST) else []
    for chance, session, form in ((0.06, control_session, "rigid tail"), (0.055, helix_session, "helix"),
                                  (0.04, undulating_session, "undulating")):
        if built(day, form) and rng.random() < chance:
            sessions.append(session)
    return sessions
