"""Growth laws: depth of a scour hole under a constant velocity."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from typing import Final

import numpy as np

from tidescour.errors import DomainError
from tidescour.plan.models_bed import DEFAULT_TIME_CONSTANT, DEFAULT_TIME_EXPONENT, Equilibrium, Scour
from tidescour.scour.shapes import MODEL_CURVE, POWER, SATURATING
from tidescour.table import Confidence, Entry, symbols
from tidescour.units import FloatArray, read_only


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class GrowthLaw:
    """h = s G(c E**q h0**r t**gamma / s); t in hours, E in m/s, h, h0 and s in m.

    For a power law G(y) = y and the scale s drops out. The exponent of the excess under the time integral is always
    that of the same law, `integral_exponent`, so that laws cannot be mixed.

    Parameters
    ----------
    name, text : str
        Name in the plan; the formula in words.
    coefficient, velocity_exponent, depth_exponent, time_exponent : float
        c, q, r and gamma.
    confidence : str
        How sure the law's numbers are.
    shape : int
        `POWER`, `SATURATING` (towards an equilibrium depth) or `MODEL_CURVE` (a curve scaled by t1).
    equilibrium : {"half-alpha", "turbulence"}
        Which equilibrium depth a saturating law has; it means nothing for the others.
    curve : (2, m) array
        Of a model curve: logarithms of time over t1 and of depth over water depth, both increasing.
    """

    name: str
    text: str
    coefficient: float
    velocity_exponent: float
    depth_exponent: float
    time_exponent: float
    confidence: Confidence = "from memory"
    shape: int = POWER
    equilibrium: Equilibrium = "half-alpha"
    curve: FloatArray = field(default_factory=lambda: np.zeros((2, 1)))

    def __post_init__(self) -> None:
        """Keep a read-only copy of the curve."""
        object.__setattr__(self, "curve", read_only(self.curve))

    @property
    def integral_exponent(self) -> float:
        """Exponent p = q / gamma of the excess in the effective duration."""
        return self.velocity_exponent / self.time_exponent

    @property
    def is_power(self) -> bool:
        """Whether states add up whatever the flow."""
        return self.shape == POWER


def explicit_law(submerged_relative_density: float, scour: Scour | None = None) -> GrowthLaw:
    """Explicit growth law of the closures in the Dutch delta.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    scour : Scour, optional
        Numbers of the law in the plan; this law has none.

    Returns
    -------
    GrowthLaw
        h = E**1.7 h0**0.2 t**0.4 / (10 Delta**0.7).

    Raises
    ------
    DomainError
        If the density is not positive.

    References
    ----------
    Breusers 1966 and 1967, Delft Hydraulics (from memory).
    """
    _check_density(submerged_relative_density)
    return GrowthLaw(
        name="explicit",
        text="h = (alpha u - u_c)^1.7 h0^0.2 t^0.4 / (10 Delta^0.7), t in hours",
        coefficient=0.1 * submerged_relative_density**-0.7,
        velocity_exponent=1.7,
        depth_exponent=0.2,
        time_exponent=0.4,
    )


def time_scale_law(submerged_relative_density: float, scour: Scour | None = None) -> GrowthLaw:
    """Growth law by the time in which a hole becomes as deep as the water.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    scour : Scour, optional
        For `time_constant` and `time_exponent`, instead of 330 and 0.4.

    Returns
    -------
    GrowthLaw
        h = h0 (t / t1)**gamma with t1 = K h0**2 Delta**1.7 / E**4.3.

    Raises
    ------
    DomainError
        If the density is not positive.

    References
    ----------
    Breusers 1966 and 1967, Delft Hydraulics: K = 330 h m^2.3 s^-4.3; time exponent 0.34 to 0.40 (from memory).
    """
    _check_density(submerged_relative_density)
    constant, gamma = _time_scale_numbers(scour)
    return GrowthLaw(
        name="time-scale",
        text=f"h = h0 (t / t1)^{gamma:g}, {_time_scale_text(constant)}",
        coefficient=constant**-gamma * submerged_relative_density ** (-1.7 * gamma),
        velocity_exponent=4.3 * gamma,
        depth_exponent=1.0 - 2.0 * gamma,
        time_exponent=gamma,
    )


def saturating_law(submerged_relative_density: float, scour: Scour | None = None) -> GrowthLaw:
    """Growth law that bends towards an equilibrium depth.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    scour : Scour, optional
        For `time_constant`, `time_exponent` and `equilibrium`.

    Returns
    -------
    GrowthLaw
        h = h_e (1 - exp[ln(1 - h0 / h_e) (t / t1)**gamma]), which passes through h0 at t1; where h_e <= h0, and that
        form has no value, h = h_e (1 - exp[-(h0 / h_e) (t / t1)**gamma]).

    Raises
    ------
    DomainError
        If the density is not positive.

    References
    ----------
    Hoffmans and Verheij 1997, Scour Manual (from memory); the form for a small h_e is ours. The equilibrium depth is
    (0.5 alpha u - u_c) / u_c times the water depth, as textbooks have it, or ((1 + 3 r0) u - u_c) / u_c times it, after
    Dietz 1969 (both from memory).
    """
    constant, gamma = _time_scale_numbers(scour)
    equilibrium: Equilibrium = "half-alpha" if scour is None else scour.equilibrium
    attack = "0.5 alpha u" if equilibrium == "half-alpha" else "(1 + 3 r0) u"
    return replace(
        time_scale_law(submerged_relative_density, scour),
        name="saturating",
        text=(
            f"h = h_e (1 - exp[ln(1 - h0 / h_e) (t / t1)^{gamma:g}]), or h_e (1 - exp[-(h0 / h_e) (t / t1)^{gamma:g}]) "
            f"where h_e <= h0; h_e = h0 ({attack} - u_c) / u_c, {_time_scale_text(constant)}"
        ),
        shape=SATURATING,
        equilibrium=equilibrium,
    )


def model_curve_law(submerged_relative_density: float, scour: Scour | None = None) -> GrowthLaw:
    """Growth law by a curve from a physical model, scaled by the time in which a hole becomes as deep as the water.

    Parameters
    ----------
    submerged_relative_density : float
        rho_s / rho - 1, positive.
    scour : Scour
        For `curve_points`, time over t1 and depth over water depth, and for `time_constant` and `time_exponent`.

    Returns
    -------
    GrowthLaw
        h = h0 F(t / t1), F straight in logarithms between the rows of the curve; under the first row h goes with
        t**gamma, over the last it goes on with the slope of the last two.

    Raises
    ------
    DomainError
        If the density is not positive, or there is no curve.

    References
    ----------
    The curve's own source; t1 as in `time_scale_law`. The exponent gamma also takes the means of the averaging rules.
    """
    constant, gamma = _time_scale_numbers(scour)
    if scour is None or len(scour.curve_points) < 2:
        raise DomainError("the model curve needs at least two rows of time_over_t1 and depth_over_water_depth")
    points = np.log(np.array(scour.curve_points, dtype=np.float64)).T
    return replace(
        time_scale_law(submerged_relative_density, scour),
        name="model-curve",
        text=(
            f"h = h0 F(t / t1), F the curve of {scour.curve_source or 'a physical model'}, with t^{gamma:g} under its "
            f"first row; {_time_scale_text(constant)}"
        ),
        shape=MODEL_CURVE,
        curve=np.ascontiguousarray(points),
    )


LawMaker = Callable[[float, Scour | None], GrowthLaw]

_SAND = "sand of 0.1 to 2 mm without cohesion, clear water"
_COMMON_ROWS = (
    ("h", "m", "depth of the hole"),
    ("h0", "m", "water depth at the end of the protection"),
    ("t", "h", "time"),
    ("Delta", "-", "density of the grains over that of the water, less 1"),
    ("alpha", "-", "disturbance factor"),
    ("u", "m/s", "velocity at the end of the protection"),
    ("u_c", "m/s", "critical velocity"),
)
_TIME_SCALE_ROWS = (
    *_COMMON_ROWS,
    ("gamma", "-", "time_exponent, 0.4"),
    ("t1", "h", "time in which the hole becomes as deep as the water"),
    ("K", "h m^2.3 s^-4.3", "time_constant, 330"),
)
_TIME_SCALE_SAYS = "t1 = K h0^2 Delta^1.7 / (alpha u - u_c)^4.3"
_LEFT_BY = ("hole-deeper-than-evidence", "grain-outside-evidence", "swept-out-jump")
_TIME_SCALE_SOURCE = "Breusers 1966 and 1967, Delft Hydraulics (from memory); K and exponent from the plan if given"

LAWS: Final[dict[str, Entry[LawMaker]]] = {
    "explicit": Entry(
        name="explicit",
        title="Explicit growth law",
        function=explicit_law,
        says="h = (alpha u - u_c)^1.7 h0^0.2 t^0.4 / (10 Delta^0.7)",
        symbols=symbols(*_COMMON_ROWS),
        validity=f"{_SAND}, depth up to 1 to 1.5 times the water depth",
        source="Breusers 1966 and 1967, Delft Hydraulics (from memory)",
        confidence="from memory",
        left_by=_LEFT_BY,
    ),
    "time-scale": Entry(
        name="time-scale",
        title="Growth law by time scale",
        function=time_scale_law,
        says=f"h = h0 (t / t1)^gamma, {_TIME_SCALE_SAYS}",
        symbols=symbols(*_TIME_SCALE_ROWS),
        validity=f"{_SAND}, depth 0.1 to 1.5 times the water depth; exponent 0.34 to 0.40 in plane flow, up to 0.8 "
        "reported for strongly three-dimensional vortices",
        source=_TIME_SCALE_SOURCE,
        confidence="from memory",
        left_by=_LEFT_BY,
    ),
    "saturating": Entry(
        name="saturating",
        title="Growth law that bends towards an equilibrium depth",
        function=saturating_law,
        says="h = h_e (1 - exp(ln(1 - h0 / h_e) (t / t1)^gamma)); h_e (1 - exp(-(h0 / h_e) (t / t1)^gamma)) where "
        "h_e <= h0\n"
        "half-alpha: h_e = h0 (0.5 alpha u - u_c) / u_c; turbulence: h_e = h0 ((1 + 3 r0) u - u_c) / u_c\n"
        + _TIME_SCALE_SAYS,
        symbols=symbols(
            *_TIME_SCALE_ROWS,
            ("h_e", "m", "equilibrium depth, by scour.equilibrium"),
            ("r0", "-", "relative turbulence at the end of the protection"),
        ),
        validity=f"{_SAND}; h_e over 2 h0: at h_e = h0 the published form has no value, depths jump, and near it a "
        "stronger bed can come out deeper; steady equilibrium depths, taken at each moment of the tide with the mean "
        "water depth of the stage; starts faster than the time-scale law; the two forms of the equilibrium depth "
        "disagree by tens of per cent; hours are counted from a flat bed, so that a stage cut in two digs up to a few "
        "per cent deeper",
        source="Hoffmans and Verheij 1997, Scour Manual (from memory); small h_e: own continuation",
        confidence="from memory",
        left_by=(*_LEFT_BY, "small-equilibrium"),
    ),
    "model-curve": Entry(
        name="model-curve",
        title="Growth along the curve of a physical model, scaled by t1",
        function=model_curve_law,
        says=f"h = h0 F(t / t1), with t^gamma under the first row of the curve; {_TIME_SCALE_SAYS}",
        symbols=symbols(*_TIME_SCALE_ROWS, ("F", "-", "curve of the model, straight in logarithms between its rows")),
        validity="as far as the model is like the works; beyond the last row of the curve it is only extended",
        source=_TIME_SCALE_SOURCE + "; the curve has its own source in the plan",
        confidence="from memory",
        left_by=(*_LEFT_BY, "beyond-model-curve"),
    ),
}


def _time_scale_numbers(scour: Scour | None) -> tuple[float, float]:
    constant = DEFAULT_TIME_CONSTANT if scour is None or scour.time_constant is None else scour.time_constant
    gamma = DEFAULT_TIME_EXPONENT if scour is None or scour.time_exponent is None else scour.time_exponent
    return constant, gamma


def _time_scale_text(constant: float) -> str:
    return f"t1 = {constant:g} h0^2 Delta^1.7 / (alpha u - u_c)^4.3, t in hours"


def _check_density(submerged_relative_density: float) -> None:
    if not submerged_relative_density > 0.0:
        raise DomainError(f"submerged relative density {submerged_relative_density:g} must be positive")
