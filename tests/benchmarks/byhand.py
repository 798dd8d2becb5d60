"""What the benchmarks compare with: the same work by hand in numpy, pint, csv and sqlite3, as fast as it goes."""

import csv
import math
import sqlite3

import numpy as np
import pint

from labbook.physics import tails


def numbers_by_hand(columns, section, glycerol, andrade) -> dict[str, np.ndarray]:
    """Every resolved quantity and number of a block of runs, values only.

    columns: one SI array a run and key (f, theta0, U, A_tip, T, B, h_wall and the swimmer's L, body, d, w, t, b,
    m, E); section: bool array, True for a strip; glycerol: bool array, True where the fluid is the 85 %
    mixture, else silicone oil with mu = A exp(B/T), andrade = (A, B).
    """
    f, theta0, U, A_tip, T, B, h_wall, L, body, d, w, t, b, m, E = columns
    c, x = T - 273.15, 0.85
    water = 1.790e-3 * np.exp((-1230 - c) * c / (36100 + 360 * c))
    pure = 12.1 * np.exp((-1233 + c) * c / (9900 + 70 * c))
    a_ = 0.705 - 0.0017 * c
    b_ = (4.9 + 0.036 * c) * a_**2.5
    alpha = 1 - x + a_ * b_ * x * (1 - x) / (a_ * x + b_ * (1 - x))
    mu = np.where(glycerol, water**alpha * pure ** (1 - alpha), andrade[0] * np.exp(andrade[1] / T))
    rho_w = 1000 * (1 - np.abs((c - 3.98) / 615) ** 1.71)
    rho_g = 1273 - 0.612 * c
    kappa = 1 + (1.78e-6 * c**2 - 1.82e-4 * c + 1.41e-2) * math.sin(math.pi * x**1.31) ** 0.81
    mixed = kappa * (rho_w + (rho_g - rho_w) / (1 + rho_g / rho_w * (1 / x - 1)))
    rho = np.where(glycerol, mixed, 970 * (1 - 0.95e-3 * (c - 25)))
    omega, nu = 2 * math.pi * f, mu / rho
    area = np.where(section, w * t**3 / 12, math.pi * d**4 / 64)
    a = np.where(section, (w + t) / 4, d / 2)
    flat = np.where(section, t / (w + t) - 0.5, 0.0)
    p = L / (2 * a)
    zeta_n = 4 * math.pi * mu / (np.log(p) + 0.839 + 0.185 / p + 0.233 / p**2 + flat)
    zeta_t = 2 * math.pi * mu / (np.log(p) - 0.207 + 0.980 / p - 0.133 / p**2)
    EI = E * area
    Sp, R_head = L * (zeta_n * omega / EI) ** 0.25, 6 * math.pi * mu * b
    # a tail's force has no shorter way by hand than the function of Sp and head, asked for its values alone
    force = tails.response(drive="free_head_angle", Sp=Sp, head=b / L, head_drag=R_head / (zeta_n * L)).force
    scale, drag = (zeta_n - zeta_t) * omega * (L * theta0) ** 2, zeta_t * L + R_head
    U_model = force * scale / drag
    return {
        "Re": rho * U * body / mu, "Re_omega": rho * omega * L**2 / mu, "Wo": L * np.sqrt(omega / nu),
        "Sp": Sp, "St": f * A_tip / U, "Sw": omega * A_tip * body / nu,
        "stride": U / (f * body), "U_scaled": U / (omega * L * theta0**2), "Mn": m * B * L / EI,
        "f_ratio": 2 * math.pi * f * 8 * math.pi * mu * b**3 / (m * B), "zeta_ratio": zeta_n / zeta_t,
        "slenderness": L / (2 * a), "wall": b / h_wall, "EI": EI, "I_area": area,
        "U_model": U_model, "U_ratio": U / U_model, "F_scaled": U * drag / scale,
    }  # fmt: skip


def numbers_with_pint(rows: int) -> None:
    """Twelve numbers a row with pint quantities, values only, as a notebook cell would do it."""
    unit = pint.UnitRegistry()
    for i in range(rows):
        f, U, L, body = unit.Quantity(1.0 + i * 1e-6, "Hz"), unit.Quantity(1e-4, "m/s"), *(
            unit.Quantity(v, "m") for v in (0.020, 0.025)
        )
        mu, rho, A_tip = unit.Quantity(1.0, "Pa*s"), unit.Quantity(970.0, "kg/m**3"), unit.Quantity(2e-3, "m")
        EI, zeta_n, zeta_t = unit.Quantity(7e-8, "N*m**2"), unit.Quantity(3.0, "Pa*s"), unit.Quantity(2.0, "Pa*s")
        m, B, b, h = unit.Quantity(1e-4, "A*m**2"), unit.Quantity(5e-3, "T"), *(
            unit.Quantity(v, "m") for v in (2e-3, 2e-2)
        )
        omega, nu = 2 * math.pi * f, mu / rho
        for number in (
            rho * U * body / mu, rho * omega * L**2 / mu, L * (omega / nu) ** 0.5,
            L * (zeta_n * omega / EI) ** 0.25, f * A_tip / U, omega * A_tip * body / nu, U / (f * body),
            U / (omega * L), m * B * L / EI, 2 * math.pi * f * 8 * math.pi * mu * b**3 / (m * B), zeta_n / zeta_t,
            b / h,
        ):  # fmt: skip
            number.to("dimensionless").magnitude  # noqa: B018


def sheet_as_text(path, text: str) -> None:
    """csv and sqlite3 executemany of the same cells as text."""
    rows = list(csv.reader(text.splitlines()))
    connection = sqlite3.connect(path)
    connection.execute(f"CREATE TABLE sheet ({', '.join(f'c{i} TEXT' for i in range(len(rows[0])))})")
    connection.executemany(f"INSERT INTO sheet VALUES ({', '.join('?' * len(rows[0]))})", rows[1:])
    connection.commit()
    connection.close()
