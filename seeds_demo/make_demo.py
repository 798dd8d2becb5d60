"""Writes the demo's shelf folder beside this file: an invented group's shelf, year, tracks, others' points.

Run `python seeds_demo/make_demo.py` with labbook installed; the same sheets and tracks come out each time.
"""

import csv
from pathlib import Path

import demo_published as published
import demo_shelf as shelf
import demo_tracks as tracks
import demo_trials as trials
import numpy as np

SEED = 20251124
HEADINGS = {
    "fluids": ("code", "kind", "glycerol [wt%]", "grade [cSt]", "rho [kg/m3]", "made", "note"),
    "readings": ("of", "key", "value", "T [degC]", "on", "how", "note"),
    "materials": ("code", "kind", "rho_s [g/cm3]", "made", "note"),
    "swimmers": ("code", "form", "material", "L_body [mm]", "L_tail [mm]", "section", "d [mm]", "w [mm]",
                 "t [mm]", "D [mm]", "d_in [mm]", "R_helix [mm]", "pitch [mm]", "b [mm]", "m_mag [mA.m2]",
                 "parent", "built", "note"),
    "rigs": ("code", "kind", "turns", "radius [mm]", "current_to_B [mT/A]", "scale [um/px]", "fps [1/s]",
             "u_f [Hz]", "u_theta0 [rad]", "u_B [mT]", "u_T [K]", "calibrated", "note"),
    "runs": ("swimmer", "fluid", "rig", "at", "by", "f [Hz]", "drive", "theta0 [rad]", "B [mT]", "I_coil [A]",
             "T [degC]", "T_end [degC]", "U [mm/s]", "A_tip [mm]", "h_wall [mm]", "series", "state", "why",
             "note"),
    "published": ("series", "citation", "x", "x_value", "x_dialect", "y", "y_value", "y_dialect", "L_tail [mm]",
                  "L_body [mm]", "d [mm]", "note"),
}
SIZES = {"rod": ("d",), "strip": ("w", "t"), "tube": ("D", "d_in"), "": ()}


def fluid_row(fluid):
    return dict(code=fluid.code, kind=fluid.kind, glycerol=fluid.glycerol, grade=fluid.grade, rho=fluid.rho,
                made=fluid.made.isoformat(), note=fluid.note)


def material_row(material):
    return dict(code=material.code, kind=material.kind, rho_s=material.rho_s, made=material.made.isoformat(),
                note=material.note)


def swimmer_row(swimmer):
    row = dict(code=swimmer.code, form=swimmer.form, material=swimmer.material, section=swimmer.section,
               parent=swimmer.parent, built=swimmer.built.isoformat(), note=swimmer.note)
    row["L_body"] = f"{swimmer.L_body or swimmer.L_tail + 2.0 * swimmer.b + 0.3:.1f}"
    row |= {key: f"{size:.2f}(1)" for key, size in zip(SIZES[swimmer.section], swimmer.size, strict=True)}
    if swimmer.L_tail:
        row["L_tail"] = f"{swimmer.L_tail:.1f}(1)"
    if swimmer.helix:
        row["R_helix"], row["pitch"] = (f"{size:.2f}(3)" for size in swimmer.helix)
    if swimmer.b:
        row["b"] = f"{swimmer.b:.2f}(2)"
    if swimmer.m_mag:
        row["m_mag"] = f"{1e3 * swimmer.m_mag:.2f}(8)"
    return row


def sheets():
    """Every sheet as rows of text by key; deterministic."""
    return {
        "fluids": [fluid_row(fluid) for fluid in shelf.FLUIDS],
        "readings": shelf.readings(np.random.default_rng(SEED)),
        "materials": [material_row(material) for material in shelf.MATERIALS],
        "swimmers": [swimmer_row(swimmer) for swimmer in shelf.SWIMMERS],
        "rigs": list(shelf.RIGS),
        "runs": trials.runs(np.random.default_rng(SEED + 1)),
        "published": list(published.POINTS),
    }


def main():
    folder = Path(__file__).resolve().parent
    written = sheets()
    for name, rows in written.items():
        with open(folder / f"{name}.csv", "w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(HEADINGS[name])
            for row in rows:
                writer.writerow([row.get(heading.split(" [")[0], "") for heading in HEADINGS[name]])
    tracks.write(folder / "tracks", written["runs"], SEED)


if __name__ == "__main__":
    main()
