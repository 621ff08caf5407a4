"""The bias law of a ring refitted to own readings."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import OERSTED
from buckdesign.design.bias_points import BiasPoint
from buckdesign.parts import Material, Ring
from buckdesign.physics.bias import permeability_fraction, ring_inductance_fraction
from buckdesign.physics.ring import core_constant_c1, effective_length, permeability_of_inductance_factor
from buckdesign.physics.unknown_core import METER_TOLERANCE

Floats = NDArray[np.float64]
Model = Callable[[Floats, Floats], Floats]

ANCHOR_FIELD = 50.0 * OERSTED
"""Field at which the tables give the known point of the bias law [A/m]."""

FIRST_HALF_FIELD = 5000.0
"""Half field that a fit starts from where the table has none [A/m] (middle of the iron powders)."""

FIRST_EXPONENT, EXPONENT_DEVIATION = 1.5, 0.2
"""Exponent before the readings and its standard deviation [1]; the tables' own uncertainty."""

HALF_FIELD_DEVIATION = 0.5
"""Standard deviation of the logarithm of the half field before the readings [1]: wide, so that they rule."""

UNKNOWN_DEVIATION = 3.0
"""The same for the inductance of a material without a law of its own [1]: nothing is known."""


@dataclass(frozen=True, kw_only=True)
class BiasLaw:
    """Law of the permeability under bias, ``1/(1 + (H/H50)^c)``.

    Attributes
    ----------
    half_field_a_per_m, exponent : float
        ``H50`` [A/m] and ``c`` [1].
    exponent_uncertainty : float
        Plus or minus on the exponent [1].
    origin : str
        Where it comes from.
    """

    half_field_a_per_m: float
    exponent: float
    exponent_uncertainty: float
    origin: str


@dataclass(frozen=True, kw_only=True)
class BiasFit:
    """What a refit to own readings found.

    Attributes
    ----------
    permeability : float
        Initial permeability that gives the unbiased inductance by the ring formula [1].
    inductance_h : float
        Unbiased inductance [H].
    half_field_error, exponent_error, inductance_error : float
        Standard errors, of half field and inductance as fractions [1].
    rms_residual : float
        Of the readings, as a fraction [1].
    points : int
        Number of readings.
    """

    permeability: float
    inductance_h: float
    half_field_error: float
    exponent_error: float
    inductance_error: float
    rms_residual: float
    points: int


@dataclass(frozen=True, kw_only=True, eq=False)
class FittedBias:
    """A bias law fitted to readings, with what is needed to draw it.

    Attributes
    ----------
    law : BiasLaw
        The law.
    fit : BiasFit
        How well it is known.
    parameters, covariance : ndarray, shape (3,), (3, 3)
        Of the logarithms of unbiased inductance and half field, and of the exponent.
    turns : int
        Winding.
    outer, inner : float
        Diameters of the ring [m].
    """

    law: BiasLaw
    fit: BiasFit
    parameters: Floats
    covariance: Floats
    turns: int
    outer: float
    inner: float

    def logarithm(self, parameters: Floats, current: Floats) -> Floats:
        """Logarithm of the inductance at currents [A]."""
        half, exponent = np.exp(parameters[1]), parameters[2]
        drive = self.turns * current
        fraction = ring_inductance_fraction(drive, self.outer, self.inner, half, exponent)
        return np.asarray(parameters[0] + np.log(fraction))

    def curve(self, current: Floats) -> tuple[Floats, Floats, Floats]:
        """Inductance at currents, and its band of two standard deviations, low and high [H]."""
        middle = self.logarithm(self.parameters, current)
        slopes = _slopes(lambda value: self.logarithm(value, current), self.parameters)
        wide = 2.0 * np.sqrt(np.einsum("ij,jk,ik->i", slopes, self.covariance, slopes))
        return np.exp(middle), np.exp(middle - wide), np.exp(middle + wide)


def fit_bias(
    ring: Ring,
    material: Material,
    turns: int,
    stack: int,
    points: Sequence[BiasPoint],
    prior: tuple[float, float],
) -> FittedBias:
    """Fit the bias law to readings on a wound ring.

    Parameters
    ----------
    ring : Ring
        The ring.
    material : Material
        What it is taken for; its law is where the fit starts from and leans on where readings are few.
    turns, stack : int
        Winding.
    points : sequence of BiasPoint
        Readings.
    prior : tuple of float
        Unbiased inductance expected [H] and its tolerance as a fraction [1].

    Returns
    -------
    FittedBias
        Law and uncertainty.

    Notes
    -----
    Least squares with the readings' logarithms within the meter's tolerance and the parameters about their
    start, each with its standard deviation; errors are enlarged where the readings scatter more.
    """
    unbiased, tolerance = prior
    half, exponent = material.bias_field or FIRST_HALF_FIELD, material.bias_exponent or FIRST_EXPONENT
    start = np.array([math.log(unbiased), math.log(half), exponent])
    first = tolerance / math.sqrt(3.0) if material.bias_field else UNKNOWN_DEVIATION
    scale = np.array([first, HALF_FIELD_DEVIATION, EXPONENT_DEVIATION])
    current = np.array([one.current for one in points])
    reading = np.log(np.array([one.inductance for one in points]))
    size = ring.outer_diameter, ring.inner_diameter

    def model(theta: Floats, amperes: Floats) -> Floats:
        fraction = ring_inductance_fraction(turns * amperes, *size, np.exp(theta[1]), theta[2])
        return np.asarray(theta[0] + np.log(fraction))

    theta, covariance = _least_squares(model, current, reading, start, scale)
    residual = model(theta, current) - reading
    errors = np.sqrt(np.diag(covariance))
    inductance = float(np.exp(theta[0]))
    c1 = core_constant_c1(*size, ring.height)
    fit = BiasFit(
        permeability=float(permeability_of_inductance_factor(inductance / (turns**2 * stack), c1)),
        inductance_h=inductance,
        half_field_error=float(errors[1]),
        exponent_error=float(errors[2]),
        inductance_error=float(errors[0]),
        rms_residual=float(np.sqrt(np.mean(np.square(residual)))),
        points=len(points),
    )
    law = BiasLaw(
        half_field_a_per_m=float(np.exp(theta[1])),
        exponent=float(theta[2]),
        exponent_uncertainty=2.0 * fit.exponent_error,
        origin=f"fitted to {len(points)} readings on {ring.name}, {turns} turns",
    )
    return FittedBias(
        law=law, fit=fit, parameters=theta, covariance=covariance, turns=turns, outer=size[0], inner=size[1]
    )


def fit_warnings(fit: BiasFit, unbiased: float, spread: float) -> list[str]:
    """What to mind about a fit.

    Parameters
    ----------
    fit : BiasFit
        The fit.
    unbiased, spread : float
        Inductance that ring and material should have [H], and its tolerance as a fraction [1].

    Returns
    -------
    list of str
        Warnings.
    """
    found = []
    if fit.rms_residual > METER_TOLERANCE:
        found.append(
            f"the readings scatter by {fit.rms_residual * 100:.0f} % about the law: check leads and meter"
        )
    ratio = fit.inductance_h / unbiased
    if not 1.0 - 1.5 * spread <= ratio <= 1.0 + 1.5 * spread:
        found.append(f"the unbiased inductance is {ratio:.2f} of what it should be: is it another material?")
    if fit.points < 3:
        found.append("fewer than three readings: the law leans on the table")
    return found


def _least_squares(
    model: Model, current: Floats, reading: Floats, start: Floats, scale: Floats
) -> tuple[Floats, Floats]:
    """Parameters and covariance; readings within the meter's tolerance, parameters about their start."""
    from scipy.optimize import least_squares

    deviation = METER_TOLERANCE / math.sqrt(3.0)

    def residuals(theta: Floats) -> Floats:
        return np.concatenate([(model(theta, current) - reading) / deviation, (theta - start) / scale])

    low, high = start - 20.0 * scale, start + 20.0 * scale
    low[2], high[2] = 0.3, 6.0
    found = least_squares(residuals, start, bounds=(low, high), x_scale=scale, xtol=1e-12, ftol=1e-12)
    jacobian = _slopes(residuals, found.x)
    excess = max(1.0, float(np.mean(np.square((model(found.x, current) - reading) / deviation))))
    return np.asarray(found.x), np.asarray(np.linalg.inv(jacobian.T @ jacobian) * excess)


def _slopes(function: Callable[[Floats], Floats], at: Floats) -> Floats:
    """Derivatives by central differences, one column a parameter."""
    columns = []
    for index in range(len(at)):
        step = np.zeros_like(at)
        step[index] = 1e-6 * max(1.0, abs(at[index]))
        columns.append((function(at + step) - function(at - step)) / (2.0 * step[index]))
    return np.stack(columns, axis=1)


def fitted_material(ring: Ring, material: Material, fitted: FittedBias, most_current: float) -> Material:
    """The material with the refitted law, under a name of its own.

    Parameters
    ----------
    ring : Ring
        What was measured.
    material : Material
        What it was taken for; loss and limits are kept.
    fitted : FittedBias
        The law.
    most_current : float
        Largest current of a reading [A].

    Returns
    -------
    Material
        For a table of the user's own.
    """
    law, fit = fitted.law, fitted.fit
    half, exponent = law.half_field_a_per_m, law.exponent
    share = float(permeability_fraction(ANCHOR_FIELD, half, exponent))
    give = share * (1.0 - share) * exponent * fit.half_field_error
    length = ring.effective_length or float(effective_length(ring.outer_diameter, ring.inner_diameter))
    reached = fitted.turns * most_current / length
    return replace(
        material,
        name=f"{material.name} measured on {ring.name}",
        permeability=fit.permeability,
        permeability_tolerance=max(2.0 * fit.inductance_error, METER_TOLERANCE),
        al_as="",
        bias_field=half,
        bias_exponent=exponent,
        bias_exponent_uncertainty=law.exponent_uncertainty,
        bias_anchor=share,
        bias_anchor_field=ANCHOR_FIELD,
        bias_anchor_uncertainty=max(2.0 * give, 1e-3),
        bias_field_limit=max(reached, material.bias_field_limit or 0.0),
        bias_how=law.origin,
        source=f"own bench readings: {law.origin}",
        how="fitted",
    )
