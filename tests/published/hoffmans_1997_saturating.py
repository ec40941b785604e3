"""Work out the numbers of `hoffmans_1997_saturating.csv` from the formulas as printed; the last row is at infinity."""

import numpy as np

TURBULENCE, VELOCITY, CRITICAL, DEPTH = 0.2, 1.2, 0.45, 10.0
DRIVING = (0.5 * (1.5 + 5.0 * TURBULENCE), 1.0 + 3.0 * TURBULENCE)
EQUILIBRIA = [DEPTH * (driving * VELOCITY - CRITICAL) / CRITICAL for driving in DRIVING]

if __name__ == "__main__":
    for share in (0.01, 0.1, 1.0, 10.0):
        bent = [deep * (1.0 - np.exp(np.log(1.0 - DEPTH / deep) * share**0.4)) for deep in EQUILIBRIA]
        print(f"{share:g}", *(f"{depth:.3f}" for depth in (*bent, DEPTH * share**0.4)), sep=",")
    print("inf", *(f"{depth:.2f}" for depth in EQUILIBRIA), "inf", sep=",")
