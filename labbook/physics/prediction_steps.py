"""What a prediction is made of: steps from key to key, models that chain them, and the steps of a head."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from labbook.physics import heads


@dataclass(frozen=True)
class Step:
    """One analytic function of a prediction: function(**takes) gives the arrays `gives`, in this order.

    One array where `gives` has one key, else a tuple. slopes(**takes), where there is one, takes real arrays
    and gives (value, {input: slope}) for each of `gives` in about the time of two function calls.
    """

    gives: tuple[str, ...]
    takes: tuple[str, ...]
    function: Callable
    slopes: Callable | None = None


@dataclass(frozen=True)
class Model:
    """What is predicted for one form and drive.

    says: one sentence. steps: to U_model and, for a tail, A_tip_model; more: for a tail, to theta_model
    (angle amplitude at the base, rad), F_model (mean push of the tail, N) and P_model (mean power of the
    drive, W). needs, may: the keys that must and that may be known (NaN where not). own_u(values), real
    arrays with what the steps gave among them: the model's own standard uncertainty of U_model, m/s; None
    where none can be stated. No model: no steps.
    """

    key: str
    says: str
    source: str = ""
    needs: tuple[str, ...] = ()
    may: tuple[str, ...] = ()
    steps: tuple[Step, ...] = ()
    more: tuple[Step, ...] = ()
    own_u: Callable | None = None


HEAD_TAKES = ("mu", "b", "b_long", "h_wall", "D_tank")
WALLS = ("b_long", "h_wall", "D_tank")


def _head(**given):
    drag = heads.head_drag(**given)
    return drag.axial, drag.lateral, drag.turning, drag.spinning, drag.back


def _head_if_any(mu, b, b_long, h_wall, D_tank):
    none = np.isnan(b)
    drag = heads.head_drag(mu=mu, b=b, b_long=b_long, h_wall=h_wall, D_tank=D_tank)
    return np.where(none, 0.0, drag.axial), np.where(none, 0.0, drag.spinning)


HEAD = Step(("head_axial", "head_lateral", "head_turning", "head_spinning", "head_back"), HEAD_TAKES, _head)
HEAD_IF_ANY = Step(("head_axial", "head_spinning"), HEAD_TAKES, _head_if_any)
