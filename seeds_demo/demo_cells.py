"""How the invented people type a value into a cell: shorthand, plus-minus, units of their own."""

from math import floor, log10


def rounded_u(u):
    """(u, decimals): an uncertainty kept to two digits where it starts with 1 or 2, else to one."""
    exponent = floor(log10(u))
    digits = 2 if u / 10.0**exponent < 2.95 else 1
    decimals = digits - 1 - exponent
    return round(u, decimals), decimals


def shorthand(value, u, unit=""):
    """'12.4(3)' or '12.4(3) mm/s'."""
    u, decimals = rounded_u(u)
    decimals = max(decimals, 0)
    number = f"{value:.{decimals}f}"
    bracket = f"{u:.{decimals}f}" if u >= 1.0 else f"{round(u * 10**decimals)}"
    return f"{number}({bracket}) {unit}".strip()


def plus_minus(value, u, unit=""):
    """'12.4 +- 0.3' or '12.4 +- 0.3 mm/s'."""
    u, decimals = rounded_u(u)
    decimals = max(decimals, 0)
    return f"{value:.{decimals}f} +- {u:.{decimals}f} {unit}".strip()


def two_digits(value):
    """A set value rounded to two figures, as one turns a knob: 0.14, 1.2, 23."""
    return round(value, 1 - floor(log10(abs(value))))


def plain(value):
    """The shortest text of a set value."""
    return f"{value:.6g}"


def speed(by, U, u):
    """Cell of a column headed mm/s in the habit of the person, and the speed that it says (all in m/s)."""
    scale, unit = 1e3, ""
    if by == "sable" and abs(U) < 1e-3:
        scale, unit = 1e6, "um/s"
    elif by == "pike" and abs(U) < 1e-3:
        scale, unit = 6e4, "mm/min"
    elif by == "pike" and abs(U) > 2e-2:
        scale, unit = 1e2, "cm/s"
    text = (plus_minus if by == "wren" else shorthand)(U * scale, u * scale, unit)
    return text, float(text.split("(")[0].split()[0]) / scale


def frequency(by, f, rotating):
    """Cell of a column headed Hz."""
    if by == "pike" and rotating:
        return f"{plain(60.0 * f)} rpm"
    if by == "sable" and f < 0.1:
        return f"{plain(1e3 * f)} mHz"
    return f"{plain(f)} Hz" if by == "wren" else plain(f)


def angle(by, theta0, u):
    """Cell of a column headed rad."""
    if by == "sable":
        return shorthand(theta0 * 57.29578, u * 57.29578, "deg")
    return plus_minus(theta0, u) if by == "wren" else shorthand(theta0, u)


def temperature(by, T):
    """Cell of a column headed degC, T in K."""
    return f"{T - 273.15:.1f} degC" if by == "wren" else f"{T - 273.15:.1f}"
