"""Test cuts by the straight-line law and a calibration from them."""

import numpy as np

from cutblock.records.shop import Calibration
from cutblock.wire.calibration import fit_coupons
from cutblock.wire.kerf import LEAST_KERF_M, kerf_rate

LEAST_M, HEAT_J_KG, THRESHOLD_W_M = 0.15e-3, 800e3, 13.0
ERROR_M = 0.06e-3


def design():
    """Powers, speeds and densities of the 9 + 2 cuts."""
    powers = np.repeat([40.0, 60.0, 90.0], 3)
    beyond = np.tile([0.45e-3, 0.82e-3, 1.5e-3], 3)
    powers, beyond = np.r_[powers, 60.0, 60.0], np.r_[beyond, 0.82e-3, 0.82e-3]
    densities = np.r_[np.full(10, 20.0), 25.0]
    return powers, kerf_rate(powers, densities) / beyond, densities


def linear_kerfs(powers, speeds, densities):
    return LEAST_M + (powers - THRESHOLD_W_M) / (densities * HEAT_J_KG * speeds)


def source_kerfs(powers, speeds, densities):
    return LEAST_KERF_M + kerf_rate(powers, densities) / speeds


def sample_calibration(**changes):
    powers, speeds, densities = design()
    scatter = ERROR_M * np.array([0.3, -0.8, 0.5, 1.1, -0.6, 0.2, -1.0, 0.7, 0.1, -0.4, 0.6])
    law = fit_coupons(powers, speeds, densities, linear_kerfs(powers, speeds, densities) + scatter).law
    scale = np.array([1e3, 1e-3, 1.0])
    values = {
        "name": "shop",
        "wire": "NiCr80 0.40",
        "alloy": "NiCr80",
        "diameter_mm": 0.4,
        "machine": "four-axis-2600",
        "grade": "EPS 100",
        "date": "2026-03-02",
        "least_kerf_mm": law.least_kerf_m * 1e3,
        "heat_kj_kg": law.heat_j_kg * 1e-3,
        "threshold_w_m": law.threshold_w_m,
        "covariance": law.covariance * np.outer(scale, scale),
        "degrees_of_freedom": law.degrees_of_freedom,
        "n_coupons": 11,
        "chi_square": 0.5,
        "density_kg_m3": (20.0, 25.0),
        "power_w_m": (40.0, 90.0),
        "speed_mm_s": (1.1, 10.7),
    }
    return Calibration(**(values | changes))
