"""How many kerf rates, fits and speed limits the wire room works out in a second; run it on demand.

python tests/benchmarks/bench_wire.py; times are of the processor, so that a busy machine does not count.
"""

import argparse
import sys
import time

import numpy as np
from kit.coupons import ERROR_M, design, linear_kerfs

from cutblock.wire.calibration import fit_coupons, limit_speeds
from cutblock.wire.kerf import kerf_rate

WANTED_A_SECOND = 100_000
N_FITS = 2_000


def seconds(action, times=3):
    """Return the least processor time of a few runs, s."""
    taken = []
    for _ in range(times):
        start = time.process_time()
        action()
        taken.append(time.process_time() - start)
    return min(taken)


def main():
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rates", type=int, default=200_000, help="kerf rates in one array (200000)")
    chosen = parser.parse_args()
    rng = np.random.default_rng(1)
    powers, densities = rng.uniform(20.0, 150.0, chosen.rates), rng.uniform(10.0, 40.0, chosen.rates)
    kerf_rate(powers[:10], densities[:10])

    rates = chosen.rates / seconds(lambda: kerf_rate(powers, densities))
    cuts = design()
    kerfs = linear_kerfs(*cuts)
    noise = rng.normal(0.0, ERROR_M, (N_FITS, 11))
    fits = N_FITS / seconds(lambda: [fit_coupons(*cuts, kerfs + row) for row in noise])
    law = fit_coupons(*cuts, kerfs).law
    limits = chosen.rates / seconds(lambda: limit_speeds(law, powers + 10.0, densities, 0.9e-3, 2e-3))
    sys.stdout.write(
        f"kerf rates   {rates:12,.0f} a second (wanted {WANTED_A_SECOND:,})\n"
        f"fits         {fits:12,.0f} a second, of 11 coupons\n"
        f"speed limits {limits:12,.0f} a second, by test cuts\n"
    )
    return 0 if rates >= WANTED_A_SECOND else 1


if __name__ == "__main__":
    sys.exit(main())
