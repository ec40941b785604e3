"""Work out the numbers of `breusers_1967_growth.csv` and `breusers_1967_law_ratio.csv` from the formulas as printed."""

DENSITY, EXCESS, DEPTH = 1.65, 2.5 * 1.2 - 0.45, 10.0


def explicit(excess, hours):
    """Explicit law."""
    return excess**1.7 * DEPTH**0.2 * hours**0.4 / (10.0 * DENSITY**0.7)


def by_time_scale(excess, hours, gamma):
    """Law of the time scale, K = 330."""
    scale_h = 330.0 * DEPTH**2 * DENSITY**1.7 / excess**4.3
    return DEPTH * (hours / scale_h) ** gamma


if __name__ == "__main__":
    for hours in (1, 24, 100, 500, 1000):
        depths = explicit(EXCESS, hours), by_time_scale(EXCESS, hours, 0.4), by_time_scale(EXCESS, hours, 0.38)
        print(hours, *(f"{depth:.5f}" for depth in depths), sep=",")
    for excess in (0.2, 0.5, 1.0, 2.0, 3.0, 5.0):
        print(f"{excess:g},{explicit(excess, 1.0) / by_time_scale(excess, 1.0, 0.4):.3f}")
