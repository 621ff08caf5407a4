"""Rings and core materials: frozen dataclasses, SI units.

The table is open data in the package ``cores_data``. Rings are named by outer diameter, inner diameter and
height in mm, materials by kind and initial permeability.
"""

from __future__ import annotations

from dataclasses import dataclass

from buckdesign.parts.fields import Sign, quantity, raw_number, text


@dataclass(frozen=True, kw_only=True)
class Ring:
    """A ring core, by its dimensions.

    Attributes
    ----------
    name : str
        ``R 26.9/14.5/11.1``.
    outer_diameter, inner_diameter, height : float
        Nominal dimensions with coating [m].
    effective_length, effective_area, effective_volume : float
        Published effective values [m], [m2], [m3]; None: compute them from the dimensions.
    wound_surface : float
        Published surface of the wound ring [m2].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    outer_diameter: float = quantity("m", required=True)
    inner_diameter: float = quantity("m", required=True)
    height: float = quantity("m", required=True)
    effective_length: float | None = quantity("m")
    effective_area: float | None = quantity("m2")
    effective_volume: float | None = quantity("m3")
    wound_surface: float | None = quantity("m2")
    source: str = text(required=True)
    how: str = text(required=True)


@dataclass(frozen=True, kw_only=True)
class Material:
    """A core material, by kind and initial permeability.

    Attributes
    ----------
    name : str
        ``hydrogen-reduced iron 75``.
    kind : str
        ``iron powder``, ``other powder`` or ``ferrite``.
    permeability, permeability_tolerance : float
        Initial relative permeability [1] and its tolerance [1].
    al_as : str
        Material whose A_L rows hold for this one too; empty: its own.
    bias_field, bias_exponent, bias_exponent_uncertainty : float
        ``H50`` [A/m], ``c`` [1] and the uncertainty of ``c`` [1] in ``mu/mu_i = 1/(1 + (H/H50)^c)``.
    bias_anchor, bias_anchor_field, bias_anchor_uncertainty : float
        The known point of the law: share of the initial permeability [1] at a field [A/m], uncertainty [1].
    bias_field_limit : float
        Field up to which the law may be used [A/m].
    bias_how : str
        Where the anchor comes from.
    loss_a, loss_b, loss_c, loss_d : float
        Coefficients of ``P = f/(a/B^3 + b/B^2.3 + c/B^1.65) + d f^2 B^2`` as published: P in mW/cm3, f in Hz,
        B (peak, sinusoidal) in gauss.
    loss_as : str
        Nearest grade whose coefficients stand in for missing ones, which the loader fills in; empty: its own.
    loss_how : str
        Where the coefficients come from.
    saturation, saturation_hot : float
        Saturation flux density at 25 degC and 100 degC [T].
    temperature_advice_c, temperature_limit_c : float
        Core temperature from which ageing is of concern, and the highest one [degC].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    kind: str = text("iron powder", "other powder", "ferrite", required=True)
    permeability: float = quantity("1", required=True)
    permeability_tolerance: float | None = quantity("%")
    al_as: str = text()
    bias_field: float | None = quantity("A/m")
    bias_exponent: float | None = quantity("1")
    bias_exponent_uncertainty: float | None = quantity("1", sign=Sign.NOT_NEGATIVE)
    bias_anchor: float | None = quantity("%")
    bias_anchor_field: float | None = quantity("A/m")
    bias_anchor_uncertainty: float | None = quantity("%")
    bias_field_limit: float | None = quantity("A/m")
    bias_how: str = text()
    loss_a: float | None = raw_number("Hz G^3 cm3/mW")
    loss_b: float | None = raw_number("Hz G^2.3 cm3/mW")
    loss_c: float | None = raw_number("Hz G^1.65 cm3/mW")
    loss_d: float | None = raw_number("mW/(cm3 Hz^2 G^2)")
    loss_as: str = text()
    loss_how: str = text()
    saturation: float | None = quantity("T")
    saturation_hot: float | None = quantity("T")
    temperature_advice_c: float | None = quantity("degC")
    temperature_limit_c: float | None = quantity("degC")
    source: str = text(required=True)
    how: str = text(required=True)

    @property
    def loss_coefficients(self) -> tuple[float, float, float, float] | None:
        """``(a, b, c, d)`` as published, or None where one of them is absent."""
        a, b, c, d = self.loss_a, self.loss_b, self.loss_c, self.loss_d
        if a is None or b is None or c is None or d is None:
            return None
        return a, b, c, d


@dataclass(frozen=True, kw_only=True)
class InductanceFactor:
    """A published A_L of a ring in a material; several sources may give one.

    Attributes
    ----------
    ring, material : str
        Names in the other two tables.
    al : float
        Inductance by turns squared [H].
    suspect : str
        Why the value is doubted; empty: it is not.
    source, how : str
        Origin and certainty.
    """

    ring: str = text(required=True)
    material: str = text(required=True)
    al: float = quantity("H", required=True)
    suspect: str = text()
    source: str = text(required=True)
    how: str = text(required=True)


@dataclass(frozen=True, kw_only=True)
class LossPoint:
    """A published point of a material's core loss, sinusoidal flux.

    Attributes
    ----------
    material : str
        Name in the table of materials.
    frequency : float
        [Hz].
    flux_density : float
        Peak [T].
    loss_density : float
        [W/m3].
    source, how : str
        Origin and certainty.
    """

    material: str = text(required=True)
    frequency: float = quantity("Hz", required=True)
    flux_density: float = quantity("T", required=True)
    loss_density: float = quantity("W/m3", required=True)
    source: str = text(required=True)
    how: str = text(required=True)
