"""How a run's track is reduced: which settings there are, and what run and rig bring where they are left out."""

import re
from collections.abc import Mapping

from labbook.errors import Refusal
from labbook.physics import tracks
from labbook.physics.track_drift import Drift, drift_of
from labbook.registry.typed import read

SETTINGS = ("columns", "scale", "fps", "f", "axis", "drift", "drift_from", "trim", "still")
FIT = "fit"  # as f: the beat is looked for in the track
_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)"
_STRETCH = re.compile(rf"({_NUMBER})\s*(?:s\s*)?(?:to|-|,|;|\s)\s*({_NUMBER})\s*(?:s)?")


def known(settings: Mapping) -> dict:
    """The settings that say something; Refusal for one that there is none of."""
    for key in settings:
        if key not in SETTINGS:
            raise Refusal("settings", key, "is no setting of a track", f"one of {', '.join(SETTINGS)}")
    return {k: settings[k] for k in SETTINGS if settings.get(k) not in (None, "", {})}


def stretch(text: str) -> tuple[float, float]:
    """(t0, t1) in s of '0 to 4 s', '0 4' or '0-4'; Refusal for another text."""
    match = _STRETCH.fullmatch(text.strip().replace("−", "-").replace("–", "-"))
    if match is None:
        raise Refusal("still", text, "cannot be read as two times", "type seconds of the track, e.g. 0 to 4 s")
    return float(match[1]), float(match[2])


def reduction(
    columns: Mapping, *, f=None, axis=None, drift: tuple | None = None, trim="auto", still=None
) -> tracks.Reduction:
    """Reduce a track's SI columns as physics.tracks.reduce takes them (t, x, y, ..., scale_u, time_u).

    f: text, Hz, or 'fit' for the track's own; axis: unit vector (x, y); drift: ((vx, vy), (ux, uy)) in m/s; trim:
    'auto' or leading cycles; still: (t0, t1) in s, or a text that stretch reads. Errors: Refusal.
    """
    f = None if f == FIT else read("f", f).value if isinstance(f, str) else f
    drift = None if drift is None else Drift(*drift)
    still = stretch(still) if isinstance(still, str) else still
    return tracks.reduce(**columns, f=f, axis=axis, drift=drift, trim=trim, still=still)


def velocity_of_positions(positions: Mapping) -> tuple[tuple[float, float], tuple[float, float]]:
    """((vx, vy), (ux, uy)) in m/s of a drift track's t, x and y in SI; Refusal as the reduction."""
    found = drift_of(**positions)
    return found.velocity, found.u
