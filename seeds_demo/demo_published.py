"""Points that nobody printed: two invented series in two dialects, to stand beside the invented runs."""

MARSH = {
    "series": "marsh-2014", "citation": "bittern & coot, Letters on Invented Tails 7, 21 (2014), invented",
    "x": "Sp", "x_dialect": "rate:f", "y": "U_scaled", "y_dialect": "rate:f",
}  # fmt: skip
TARN = {
    "series": "tarn-2017", "citation": "dipper, Annals of Invented Swimming 3, 140 (2017), invented",
    "x": "Sp", "x_dialect": "coefficient:spheroid_asymptotic", "y": "U_scaled",
    "L_tail": "18.0(1)", "L_body": "22.4(1)", "d": "0.80(1)",
}  # fmt: skip
POINTS = [
    *(MARSH | {"x_value": x, "y_value": y}
      for x, y in (("0.82(2)", "0.026(4)"), ("1.07(2)", "0.057(5)"), ("1.39(3)", "0.083(6)"),
                   ("1.89(3)", "0.050(5)"), ("2.84(5)", "0.020(3)"))),
    *(TARN | {"x_value": x, "y_value": y}
      for x, y in (("0.88(1)", "1.1(2)e-3"), ("1.47(2)", "6.5(4)e-3"), ("1.96(2)", "0.0125(6)"),
                   ("2.55(3)", "0.0111(6)"), ("3.53(4)", "4.9(4)e-3"), ("5.09(6)", "2.8(3)e-3"))),
]  # fmt: skip
POINTS[2]["note"] = "read off a printed figure"
