"""The numbers of one leaf, as the kernels read them.

A crop is data, not code: its profile becomes one record, and the type of that record, C3 or C4, chooses the
equations at compile time. Energies are J mol-1 here (profiles: kJ mol-1), everything else is in the units of
the profile.
"""

from __future__ import annotations

import math

import numpy as np

from cropstress.crops import CropProfile
from cropstress.leaf.responses import GAS_CONSTANT, REFERENCE_TEMPERATURE

_COMMON = [
    "carboxylation_capacity",  # Vcmax of the top leaf at 25 degC [umol m-2 s-1]
    "electron_transport_ratio_intercept",  # Jmax25 / Vcmax25 at a growth temperature of 0 degC [1]
    "electron_transport_ratio_slope",  # its change with growth temperature [K-1]
    "respiration_ratio",  # Rd25 / Vcmax25 [1]
    "respiration_linear",  # [K-1]
    "respiration_quadratic",  # [K-2]
    "electron_loss_fraction",  # f [1]
    "light_curvature",  # theta [1]
    "stomatal_slope",  # g1 [kPa^0.5]
    "stomatal_intercept",  # g0 [mol m-2 s-1]
    "leaf_width",  # [m]
    "michaelis_co2",  # C3 [umol mol-1], C4 [ubar]
    "michaelis_co2_activation",
    "michaelis_o2",  # C3 [mmol mol-1], C4 [ubar]
    "michaelis_o2_activation",
    "oxygen",  # [mmol mol-1]
    "carboxylation_activation",
    "carboxylation_deactivation",
    "carboxylation_entropy_intercept",  # [J mol-1 K-1]
    "carboxylation_entropy_slope",  # [J mol-1 K-2]
    "electron_transport_activation",
    "electron_transport_deactivation",
    "electron_transport_entropy_intercept",
    "electron_transport_entropy_slope",
]
_C3_ONLY = [
    "compensation_point",  # photorespiratory, gamma star [umol mol-1]
    "compensation_point_activation",
    "reference_pressure",  # [kPa]
    "triose_normal",  # TPU25 with the normalisation of its peak [umol m-2 s-1]
    "triose_phosphate_activation",
    "triose_phosphate_deactivation",
    "triose_phosphate_entropy",
]
_C4_ONLY = [
    "pep_normal",  # Vcmax25 with the normalisation of the peak of Vpmax [umol m-2 s-1]
    "pep_carboxylation_ratio",  # Vpmax25 / Vcmax25 [1]
    "pep_regeneration_ratio",  # Vpr25 / Vcmax25 [1]
    "pep_michaelis",  # [ubar]
    "pep_michaelis_activation",
    "pep_carboxylation_activation",
    "pep_carboxylation_deactivation",
    "pep_carboxylation_entropy",
    "half_inverse_specificity",  # gamma star of C4 [1]
    "half_inverse_specificity_activation",
    "bundle_sheath_conductance",  # [mol m-2 s-1 bar-1]
    "bundle_sheath_oxygen_share",  # alpha [1]
    "electron_partition",  # x [1]
    "mesophyll_respiration_share",  # Rm / Rd [1]
    "oxygen_leak_ratio",  # [1]
]

C3_LEAF = np.dtype([(name, np.float64) for name in _COMMON + _C3_ONLY])
C4_LEAF = np.dtype([(name, np.float64) for name in _COMMON + _C4_ONLY])


def normalisation(deactivation: float, entropy: float) -> float:
    """Return what makes a peaked response 1 at 25 degC; Medlyn et al. 2002, Eq. 17.

    Parameters
    ----------
    deactivation : float
        [J mol-1]
    entropy : float
        [J mol-1 K-1]
    """
    return 1.0 + math.exp(
        (REFERENCE_TEMPERATURE * entropy - deactivation) / (REFERENCE_TEMPERATURE * GAS_CONSTANT)
    )


def leaf_record(profile: CropProfile, acclimation: bool = False) -> np.ndarray:
    """Turn a crop profile into the record the kernels read.

    Parameters
    ----------
    profile : CropProfile
    acclimation : bool
        Let Jmax25 / Vcmax25 follow the growth temperature (C3; Kattge & Knorr 2007).

    Returns
    -------
    numpy.ndarray
        Shape (1,), dtype `C3_LEAF` or `C4_LEAF`.
    """
    numbers = {name: value.value for name, value in (profile.kinetics | profile.values).items()}
    numbers["electron_transport_ratio_intercept"] = numbers["electron_transport_ratio"]
    numbers["electron_transport_ratio_slope"] = 0.0
    if profile.pathway == "C3":
        layout = C3_LEAF
        if acclimation:
            numbers["electron_transport_ratio_intercept"] = numbers["acclimated_ratio_intercept"]
            numbers["electron_transport_ratio_slope"] = numbers["acclimated_ratio_slope"]
    else:
        layout = C4_LEAF
        for process in ("carboxylation", "electron_transport"):
            numbers[f"{process}_entropy_intercept"] = numbers[f"{process}_entropy"]
            numbers[f"{process}_entropy_slope"] = 0.0
    peak = "triose_phosphate" if profile.pathway == "C3" else "pep_carboxylation"
    normal = normalisation(numbers[f"{peak}_deactivation"] * 1000.0, numbers[f"{peak}_entropy"])
    numbers["triose_normal"] = numbers.get("triose_phosphate_ratio", 0.0) * numbers["carboxylation_capacity"] * normal
    numbers["pep_normal"] = numbers["carboxylation_capacity"] * normal
    record = np.zeros(1, dtype=layout)
    for name in layout.names or ():
        energy = name.endswith(("_activation", "_deactivation"))
        record[name] = numbers[name] * (1000.0 if energy else 1.0)
    return record
