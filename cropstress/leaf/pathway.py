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


def state_kept(leaf: Any, *arguments: Any) -> Any:
    """Write a state into the rows of a workspace."""


def state_found(leaf: Any, *arguments: Any) -> Any:
    """Read a state from the rows of a workspace."""


def limiting_rates(leaf: Any, *arguments: Any) -> Any:
    """Both limiting net rates, by enzymes and by light, at a given intercellular CO2."""


def improved_rates(leaf: Any, *arguments: Any) -> Any:
    """Both limiting net rates nearer to where each meets the stomata by itself."""


def net_rate(leaf: Any, *arguments: Any) -> Any:
    """Net rate that follows from the limits."""


def carboxylation(leaf: Any, *arguments: Any) -> Any:
    """Carboxylation and oxygenation at a given intercellular CO2 and net rate."""


_by_pathway(leaf_state, c3.c3_state, c4.c4_state)
_by_pathway(state_kept, c3.c3_kept, c4.c4_kept)
_by_pathway(state_found, c3.c3_found, c4.c4_found)
_by_pathway(limiting_rates, c3.c3_rates, c4.c4_rates)
_by_pathway(improved_rates, c3.c3_improved_rates, c4.c4_improved_rates)
_by_pathway(net_rate, c3.c3_net_rate, c4.c4_net_rate)
_by_pathway(carboxylation, c3.c3_carboxylation, c4.c4_carboxylation)
