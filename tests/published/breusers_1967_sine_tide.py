"""Work out the numbers of `breusers_1967_sine_tide.csv` by quadrature over the half tide."""

import numpy as np
from scipy.integrate import quad

Q, GAMMA = 1.7, 0.4


def mean_of_power(k, power):
    """Mean over the half tide of (E / E_peak)^power, E = u_m sin - k u_m, and 0 under the threshold."""
    begin = np.arcsin(k)
    area, _ = quad(lambda x: ((np.sin(x) - k) / (1.0 - k)) ** power, begin, np.pi - begin, epsabs=1e-13)
    return area / np.pi


if __name__ == "__main__":
    for k in np.arange(10) / 10.0:
        share = mean_of_power(k, Q / GAMMA)
        mean = mean_of_power(k, Q)
        strict = share**GAMMA
        # Half the mean of the half tide over twice its time.
        full = 0.5 * mean * 2.0**GAMMA
        mean_held = max((2.0 / np.pi - k) / (1.0 - k), 0.0) ** Q
        print(
            f"{k:.2f},{1.0 - 2.0 * np.arcsin(k) / np.pi:.4f},{mean / strict:.4f},{full / strict:.4f},{share:.5f},"
            f"{mean:.4f},{1.0 / strict:.3f},{mean_held / strict:.3f}"
        )
