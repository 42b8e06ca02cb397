"""cropstress: what heat and photorespiration cost a crop, cell by cell.

The public functions are imported when they are first used, so that `import cropstress` stays quick.
"""

from __future__ import annotations

import importlib
from typing import Any

_PUBLIC = {
    "open_weather": "cropstress.weather",
    "load_crop": "cropstress.crops",
    "assess": "cropstress.region",
    "gas_exchange": "cropstress.one_leaf",
    "run": "cropstress.job",
}

__all__ = ["assess", "gas_exchange", "load_crop", "open_weather", "run"]


def __getattr__(name: str) -> Any:
    if name in _PUBLIC:
        return getattr(importlib.import_module(_PUBLIC[name]), name)
    raise AttributeError(f"module 'cropstress' has no attribute '{name}'")
