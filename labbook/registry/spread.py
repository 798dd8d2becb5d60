"""Propagation of standard uncertainty by complex steps, source by source, split into own and shared.

A *part* is the signed contribution of one source to a value, (d value / d source) * u(source). Sources are
independent of each other, so a value's variance is the sum of its squared parts (JCGM 100:2008, 5.1); values
that share a source are correlated through it, and nothing more has to be carried.
"""

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field

import numpy as np

STEP = 1e-30  # relative size of the imaginary step: any tiny number serves, there is no cancellation

# sources that belong to one run alone; every other source is shared with the runs of its batch or swimmer
OWN_SOURCES = frozenset(
    ("f", "theta0", "h0", "U", "A_tip", "T", "B", "I_coil", "h_wall", "D_tank")
)


@dataclass
class Spread:
    """Values and their parts for a block of runs.

    values: key -> SI array; parts: key -> {source: array of (d key/d source) u(source)}.
    """

    values: dict[str, np.ndarray] = field(default_factory=dict)
    parts: dict[str, dict[str, np.ndarray]] = field(default_factory=dict)

    def measured(self, key: str, value, u, source: str | None = None) -> None:
        """Enter a measured quantity with its standard uncertainty; its source is its own key unless named."""
        self.values[key] = value
        self.parts[key] = {source or key: u}

    def follow(
        self, keys: Iterable[str], function: Callable, inputs: tuple[str, ...], slopes: Callable | None = None
    ) -> None:
        """Enter `keys` as function(**inputs) -> one array per key, with the parts it inherits.

        function must be analytic; it is called once with real arrays and once per uncertain input with
        that input stepped along the imaginary axis. slopes(**inputs) -> (value, {input: slope}) per key, where
        there is one, is called instead, once.
        """
        keys = tuple(keys)
        given = {k: self.values[k] for k in inputs}
        if slopes is not None:
            for key, (value, by) in zip(keys, slopes(**given), strict=True):
                self.values[key], self.parts[key] = value, {}
                for name, slope in by.items():
                    self._inherit(key, self.parts[name], slope)
            return
        for key, value in zip(keys, _several(function(**given), keys), strict=True):
            self.values[key] = value
            self.parts[key] = {}
        for name in inputs:
            inherited = self.parts[name]
            if not inherited:
                continue
            stepped = dict(given)
            size = np.abs(given[name])
            step = STEP * np.where(size > 0, size, 1.0)
            stepped[name] = given[name] + 1j * step
            for key, value in zip(keys, _several(function(**stepped), keys), strict=True):
                if not np.iscomplexobj(value):
                    continue  # this output does not depend on the input
                self._inherit(key, inherited, value.imag / step)

    def _inherit(self, key: str, inherited: Mapping[str, np.ndarray], slope) -> None:
        """Add to the parts of a key those of an input, times d key/d input."""
        parts = self.parts[key]
        for source, part in inherited.items():
            share = slope * part
            parts[source] = parts[source] + share if source in parts else share

    def own(self, key: str) -> np.ndarray:
        """Standard uncertainty from the sources of the run alone."""
        return self.sizes(key)[0] + np.zeros_like(self.values[key])

    def shared(self, key: str) -> np.ndarray:
        """Standard uncertainty from the sources that other runs share."""
        return self.sizes(key)[1] + np.zeros_like(self.values[key])

    def sizes(self, key: str) -> tuple[np.ndarray | float, np.ndarray | float]:
        """(own, shared) standard uncertainty; a plain 0.0 where no such source reaches the value."""
        own, shared = [], []
        for source, part in self.parts[key].items():
            (own if source in OWN_SOURCES else shared).append(part)
        return _root_sum(own), _root_sum(shared)

    def budget(self, key: str) -> Mapping[str, np.ndarray]:
        """The parts of one value by source."""
        return self.parts[key]


def _several(result, keys):
    return result if len(keys) > 1 else (result,)


def _root_sum(parts: list[np.ndarray]) -> np.ndarray | float:
    if not parts:
        return 0.0
    if len(parts) == 1:
        return np.abs(parts[0])
    total = parts[0] * parts[0]
    for part in parts[1:]:
        total += part * part
    return np.sqrt(total, out=total)
