"""The shelf's forms as data: fields in the order of the bench, labels, examples, and which come with what."""

EXAMPLES = {
    "code": {"fluid": "sil5k-b", "material": "sil-7", "swimmer": "reed-03", "rig": "pair-1"},
    "made": "2026-03-01", "built": "2026-03-01", "calibrated": "2026-03-01", "on": "2026-03-01",
    "note": "anything one should know", "glycerol": "85.0(3) wt%", "grade": "5000 cSt",
    "rho": "1.26(1) g/cm3", "lam": "0.50(5) s", "rho_s": "1.08(1) g/cm3", "turns": "120", "radius": "95 mm",
    "current_to_B": "1.12(1) mT/A", "scale": "21.4(1) um/px", "fps": "30 1/s", "u_f": "0.1 %",
    "u_theta0": "0.5 deg", "u_B": "2 %", "u_T": "0.2 K", "L_body": "30.0(2) mm", "L_tail": "24.0(1) mm",
    "d": "1.02(1) mm", "w": "3.00(1) mm", "t": "0.80(1) mm", "D": "2.00(1) mm", "d_in": "1.00(1) mm",
    "R_helix": "2.00(3) mm", "pitch": "8.0(1) mm", "b": "2.50(2) mm", "b_long": "4.0(1) mm",
    "m_mag": "4.17(8) mA.m2", "mu": "4.85(5) Pa.s", "nu": "5120(40) cSt", "E": "0.92(4) MPa",
    "T": "22.0(1) degC", "how": {"E": "sag, ring-down, tensile"}, 
    "kind": {"material": "silicone rubber", "rig": "Helmholtz pair"},
}  # fmt: skip
LABELS = {
    "made": "made on", "built": "built on", "calibrated": "calibrated on", "on": "measured on", "how": "how",
    "material": "material batch", "parent": "parent (cut from)", "L_tail": "tail length, axial for a helix",
    "T": "temperature", "u_f": "frequency", "u_theta0": "angle", "u_B": "flux density", "u_T": "temperature",
    "rho": "density, if constant", "lam": "relaxation time, if constant", "t": "strip thickness, bending way",
    "b_long": "long semi-axis of the head", "grade": "nominal grade at 25 degC",
}  # fmt: skip
# columns in the order of the bench; those of a fluid's kind, a swimmer's form or its section come with it
COLUMNS = {
    "fluid": ("code", "glycerol", "grade", "rho", "lam", "made", "note"),
    "material": ("code", "kind", "rho_s", "made", "note"),
    "swimmer": ("code", "material", "parent", "L_body", "L_tail", "d", "w", "t", "D", "d_in", "R_helix",
                "pitch", "b", "b_long", "m_mag", "built", "note"),
    "rig": ("code", "kind", "turns", "radius", "current_to_B", "scale", "fps", "u_f", "u_theta0", "u_B",
            "u_T", "calibrated", "note"),
    "reading": ("value", "T", "on", "how", "note"),
}  # fmt: skip
CHOOSES = {"fluid": ("kind",), "swimmer": ("form", "section"), "reading": ("key",)}
ONLY_WITH = {
    "glycerol": {"glycerol-water"}, "grade": {"silicone-oil"}, "d": {"rod"}, "w": {"strip"}, "t": {"strip"},
    "D": {"tube"}, "d_in": {"tube"}, "R_helix": {"helix"}, "pitch": {"helix"},
}  # fmt: skip
READ_OF = {"fluid": ("mu", "nu", "rho", "lam"), "material": ("E",)}

AT_RUN = " at the run's temperature"  # said by the registry's names, and of no use on the shelf
