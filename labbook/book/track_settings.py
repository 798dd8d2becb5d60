"""How a run's track is reduced: which settings there are, and what run and rig bring where they are left out."""

from collections.abc import Mapping

from labbook.errors import Refusal
from labbook.physics import tracks
from labbook.physics.track_drift import Drift
from labbook.registry.typed import read

SETTINGS = ("columns", "scale", "fps", "f", "axis", "drift", "trim", "still")
FIT = "fit"  # as f: the beat is looked for in the track


def known(settings: Mapping) -> dict:
    """The settings that say something; Refusal for one that there is none of."""
    for key in settings:
        if key not in SETTINGS:
            raise Refusal("settings", key, "is no setting of a track", f"one of {', '.join(SETTINGS)}")
    return {k: settings[k] for k in SETTINGS if settings.get(k) not in (None, "", {})}


def reduction(
    columns: Mapping, *, f=None, axis=None, drift: tuple | None = None, trim="auto", still=None
) -> tracks.Reduction:
    """Reduce a track's SI columns as physics.tracks.reduce takes them (t, x, y, ..., scale_u).

    f: text, Hz, or 'fit' for the track's own; axis: unit vector (x, y); drift: ((vx, vy), (ux, uy)) in m/s; trim:
    'auto' or leading cycles; still: (t0, t1) in s. Errors: Refusal.
    """
    f = None if f == FIT else read("f", f).value if isinstance(f, str) else f
    drift = None if drift is None else Drift(*drift)
    return tracks.reduce(**columns, f=f, axis=axis, drift=drift, trim=trim, still=still)
