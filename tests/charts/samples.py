"""Invented runs and helpers to read a chart's specification; nothing here is physics."""

import numpy as np
import pandas as pd


def runs(count=600, swimmers=6, seed=1):
    """`count` runs of Sp and U_scaled with all their uncertainty columns, every one of them drawable."""
    random = np.random.default_rng(seed)
    sp = 10 ** random.uniform(-0.3, 1.0, count)
    frame = pd.DataFrame(
        {
            "code": [f"R-{i:04d}" for i in range(count)],
            "swimmer": random.choice([f"reed-{i:02d}" for i in range(1, swimmers + 1)], count),
            "fluid": "gly85-b",
            "material": "sil-7",
            "by": "knot",
            "series": None,
            "at": pd.Timestamp("2025-03-01"),
            "state": "kept",
            "note": "never drawn",
            "Sp": sp,
            "U_scaled": 0.01 * np.exp(-(np.log(sp / 2) ** 2)) * np.exp(random.normal(0, 0.1, count)),
            "Re_omega": 10 ** random.uniform(-3, 2, count),
        }
    )
    for key in ("Sp", "U_scaled", "Re_omega"):
        frame[f"u_{key}"] = 0.05 * frame[key]
        frame[f"u_own_{key}"] = 0.03 * frame[key]
        frame[f"u_shared_{key}"] = 0.04 * frame[key]
    return frame


def specification(chart):
    return chart.to_dict()


def layer(spec, name):
    """The one layer of that name."""
    found = [part for part in spec["layer"] if part.get("name") == name]
    assert len(found) == 1, f"{name}: {[p.get('name') for p in spec['layer']]}"
    return found[0]


def rows(spec, name):
    """The rows behind a layer."""
    data = layer(spec, name).get("data", spec.get("data"))
    return data["values"] if "values" in data else spec["datasets"][data["name"]]


def addresses(spec):
    """Every text in a specification that names an outside address, the $schema line aside."""
    found = []

    def walk(node):
        if isinstance(node, dict):
            for key, value in node.items():
                if key == "url":
                    found.append(str(value))
                elif key != "$schema":
                    walk(value)
        elif isinstance(node, list):
            for value in node:
                walk(value)
        elif isinstance(node, str) and "://" in node:
            found.append(node)

    walk(spec)
    return found
