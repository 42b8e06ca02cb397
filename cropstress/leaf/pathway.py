"""One name for what C3 and C4 leaves do each in their own way.

The type of the leaf's record chooses the equations when the kernel is compiled, so the loops over lanes are
written once and neither pathway pays for the other.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numba
from numba.extending import overload

from cropstress.compiled import FAST_MATH
from cropstress.leaf import c3, c4
from cropstress.leaf.parameters import C3_LEAF

_C3_RECORD = numba.from_dtype(C3_LEAF)
_OPTIONS = {"fastmath": FAST_MATH, "error_model": "numpy", "forceinline": True}


def _by_pathway(name: Callable[..., Any], c3_relation: Any, c4_relation: Any) -> None:
    """Let compiled code that calls `name` use the relation of the leaf's own pathway."""

    def choose(leaf: Any, *arguments: Any) -> Callable[..., Any]:
        relation = c3_relation if leaf == _C3_RECORD else c4_relation
        return relation.py_func  # type: ignore[no-any-return]

    overload(name, strict=False, jit_options=_OPTIONS)(choose)


def leaf_state(leaf: Any, *arguments: Any) -> Any:
    """State of a leaf at its temperature and light: `c3_state` or `c4_state`."""


def enzyme_demand(leaf: Any, *arguments: Any) -> Any:
    """Net rate limited by enzymes and its slope with intercellular CO2."""


def light_demand(leaf: Any, *arguments: Any) -> Any:
    """Net rate limited by electron transport and its slope with intercellular CO2."""


def net_rate(leaf: Any, *arguments: Any) -> Any:
    """Net rate that follows from the limits."""


def carboxylation(leaf: Any, *arguments: Any) -> Any:
    """Carboxylation and oxygenation at a given intercellular CO2 and net rate."""


_by_pathway(leaf_state, c3.c3_state, c4.c4_state)
_by_pathway(enzyme_demand, c3.c3_enzyme_demand, c4.c4_enzyme_demand)
_by_pathway(light_demand, c3.c3_light_demand, c4.c4_light_demand)
_by_pathway(net_rate, c3.c3_net_rate, c4.c4_net_rate)
_by_pathway(carboxylation, c3.c3_carboxylation, c4.c4_carboxylation)
