"""Light and capacity of sunlit and shaded leaves; de Pury & Farquhar 1997."""

from __future__ import annotations

import math

from cropstress.compiled import exponential, inlined

DIFFUSE_EXTINCTION = 0.78  # kd [1]; de Pury & Farquhar 1997 (from memory)
SCATTERING_VISIBLE = 0.15  # 1; de Pury & Farquhar 1997 (from memory)
SCATTERING_NEAR_INFRARED = 0.80  # 1; 1 - absorptance 0.20 of Campbell & Norman 1998 (from memory)
SMALLEST_LEAF_AREA = 0.01  # 1, chosen here: less counts as none
PHOTONS_PER_JOULE = 4.57  # umol J-1 of PAR in daylight; McCree 1972 (from memory)


@inlined
def faded(depth: float) -> float:
    """Return e to the power -depth; beyond 600 it stays at what is nothing anyway."""
    return exponential(-min(depth, 600.0))


@inlined
def beam_extinction(sine: float) -> float:
    """Return kb of leaves at all angles alike."""
    return 0.5 / sine


@inlined
def absorbed(beam: float, diffuse: float, kb: float, leaf_area: float, scattering: float) -> tuple[float, float]:
    """Return what all leaves and what sunlit leaves absorb [W m-2 of ground]; science: de Pury & Farquhar."""
    kd = DIFFUSE_EXTINCTION
    root = math.sqrt(1.0 - scattering)
    kb_scattered = kb * root
    kd_scattered = kd * root
    horizontal = (1.0 - root) / (1.0 + root)
    reflected_beam = 1.0 - faded(2.0 * horizontal * kb / (1.0 + kb))
    reflected_diffuse = 1.0 - faded(2.0 * horizontal * kd / (1.0 + kd))
    by_all = (1.0 - reflected_beam) * beam * (1.0 - faded(kb_scattered * leaf_area)) + (
        1.0 - reflected_diffuse
    ) * diffuse * (1.0 - faded(kd_scattered * leaf_area))
    first = beam * (1.0 - scattering) * (1.0 - faded(kb * leaf_area))
    both = kd_scattered + kb
    second = (1.0 - reflected_diffuse) * diffuse * (1.0 - faded(both * leaf_area)) * kd_scattered / both
    twice = kb_scattered + kb
    third = beam * (
        (1.0 - reflected_beam) * (1.0 - faded(twice * leaf_area)) * kb_scattered / twice
        - (1.0 - scattering) * (1.0 - faded(2.0 * kb * leaf_area)) * 0.5
    )
    return by_all, first + second + third


@inlined
def absorbed_by_top_leaf(beam: float, diffuse: float, kb: float, scattering: float) -> float:
    """Return what a sunlit leaf at the very top absorbs [W m-2 of leaf]: the limit of no leaf area."""
    kd = DIFFUSE_EXTINCTION
    root = math.sqrt(1.0 - scattering)
    horizontal = (1.0 - root) / (1.0 + root)
    reflected_beam = 1.0 - faded(2.0 * horizontal * kb / (1.0 + kb))
    reflected_diffuse = 1.0 - faded(2.0 * horizontal * kd / (1.0 + kd))
    return (1.0 - reflected_diffuse) * diffuse * kd * root + (1.0 - reflected_beam) * beam * kb * root


@inlined
def sunlit_area(kb: float, leaf_area: float) -> float:
    """Return the sunlit leaf area [1]."""
    return (1.0 - faded(kb * leaf_area)) / kb


@inlined
def sunlit_capacity(kb: float, leaf_area: float, decline: float) -> float:
    """Return the capacity of sunlit leaves, of the top leaf's [m2 m-2]; decline over the whole canopy."""
    return (1.0 - faded(decline + kb * leaf_area)) / (decline / leaf_area + kb)


@inlined
def whole_capacity(leaf_area: float, decline: float) -> float:
    """Return the capacity of all leaves, of the top leaf's [m2 m-2]."""
    return leaf_area * (1.0 - faded(decline)) / decline


@inlined
def longwave_shares(kb: float, leaf_area: float) -> tuple[float, float]:
    """Return the shares of net longwave that all and that sunlit leaves take [1]."""
    kd = DIFFUSE_EXTINCTION
    both = kd + kb
    return 1.0 - faded(kd * leaf_area), kd / both * (1.0 - faded(both * leaf_area))
