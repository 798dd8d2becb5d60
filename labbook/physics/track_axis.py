"""The swimming axis of a track (given, of the body, or along the fitted velocity) and its test for motion."""

from dataclasses import dataclass
from math import exp, hypot

import numpy as np
from scipy.special import chndtrinc

from labbook.errors import Refusal
from labbook.physics.track_drift import pair
from labbook.physics.track_mixture import Mixture, normal_score

TURNED = 0.5  # mean resultant length of the body's directions below which they share none
LEAST = 1e-3  # a non-centrality below it is none
EXACT_SCORE = 20.0  # standard deviations beyond which a length is as good as a component


@dataclass(frozen=True)
class Axis:
    """direction: unit vector (x, y) towards the head; source: 'given', 'body' or 'velocity'."""

    direction: tuple[float, float]
    source: str


def turned(*, axis: Axis) -> Axis:
    """The same axis the other way."""
    return Axis((-axis.direction[0], -axis.direction[1]), axis.source)


def given(*, axis) -> Axis:
    """An axis from a vector (x, y) towards the head; its length does not matter, but may not be zero."""
    x, y = pair("axis", axis)
    length = hypot(x, y)
    if length == 0.0:
        raise Refusal("axis", axis, "a zero vector has no direction")
    return Axis((x / length, y / length), "given")


def ahead(*, x, y, heading, head_x, head_y):
    """Columns {ahead_x, ahead_y} of vectors towards the head, one a frame; {} where no column says.

    heading: rad from x towards y; head_x, head_y: m, a point of the body ahead of x, y.
    """
    if heading is not None and (head_x is not None or head_y is not None):
        raise Refusal("heading", None, "a head point is given too", "give one of them")
    try:
        if heading is not None:
            heading = np.asarray(heading, float)
            return {"ahead_x": np.cos(heading), "ahead_y": np.sin(heading)}
        if head_x is None and head_y is None:
            return {}
        return {
            "ahead_x": np.subtract(head_x, x, dtype=float),
            "ahead_y": np.subtract(head_y, y, dtype=float),
        }
    except (TypeError, ValueError):
        raise Refusal(
            "axis", None, "the body's columns are numbers, as many as x", "give them for every frame"
        ) from None


def from_body(*, ahead_x, ahead_y) -> Axis:
    """Mean direction of vectors towards the head, one a frame; NaN frames do not count.

    Refuses a body that turns so far that its directions share none (mean resultant length below 0.5).
    """
    direction = ahead_x + 1j * ahead_y
    length = np.abs(direction)
    direction = direction[np.isfinite(length) & (length > 0.0)]
    if len(direction) < 2:
        raise Refusal("axis", None, "no frame says where the head points", "give an axis")
    mean = np.mean(direction / np.abs(direction))
    if abs(mean) < TURNED:
        raise Refusal("axis", None, "the body turns too far for one axis", "cut the track to a straight part")
    mean /= abs(mean)
    return Axis((float(mean.real), float(mean.imag)), "body")


@dataclass(frozen=True, eq=False)
class VelocityTest:
    """axis: along the fitted velocity; p_zero: probability of a velocity at least as far from zero as
    this."""

    axis: Axis
    p_zero: float


def along_velocity(*, plane, residual, u_drift) -> VelocityTest:
    """Direction of the fitted velocity, and Hotelling's test of the vector against zero.

    The two principal directions of the frame-to-frame scatter have independent noise. In each the speed is
    fitted with its own noise and its two-sided probability of zero turned into a normal score z; under no
    motion z1^2 + z2^2 is chi-square with two degrees of freedom, so p = exp(-(z1^2 + z2^2)/2). Testing the
    speed along its own direction as if that had been given would call 14 % of still swimmers swimming at
    the 5 % level (chi-square of two against one degree of freedom). plane: the track_fit.Plane of x and y;
    residual: of both from line and beat, (2, n), m; u_drift: (ux, uy), m/s.
    """
    steps = np.diff(residual, axis=1)
    steps -= steps.mean(axis=1, keepdims=True)
    _, directions = np.linalg.eigh(steps @ steps.T)
    velocity, score = np.zeros(2), 0.0
    for e in directions.T:
        speed = plane.speed(e).joined(hypot(e[0] * u_drift[0], e[1] * u_drift[1]))
        velocity += speed.mean * e
        score += normal_score(speed.p_zero()) ** 2
    length = hypot(*velocity)
    direction = (velocity[0] / length, velocity[1] / length) if length > 0.0 else (1.0, 0.0)
    return VelocityTest(Axis((float(direction[0]), float(direction[1])), "velocity"), exp(-0.5 * score))


def length_interval(*, speed: Mixture):
    """95 % interval of the length of a velocity vector whose component along itself is `speed`.

    The length of a noisy vector is never negative and on average too long, so the lower end is the length for
    which one as long as this, or longer, comes in 2.5 % of records (non-central chi-square, two degrees of
    freedom, with the width of the lower tail of `speed`); it is 0 where no length makes it that rare.
    """
    low, high = speed.quantile(0.025), speed.quantile(0.975)
    u = (speed.mean - low) / 1.959964
    if speed.mean < EXACT_SCORE * u:
        non_central = chndtrinc(max(speed.mean / u, 0.0) ** 2, 2.0, 0.975)
        low = u * float(np.sqrt(non_central)) if LEAST < non_central < np.inf else 0.0
    return max(low, 0.0), max(high, 0.0)
