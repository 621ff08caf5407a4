"""Pinned constants, SI, each with its source."""

from __future__ import annotations

import math

MU_0 = 1.25663706212e-6
"""Magnetic constant [H/m]; CODATA 2018 (from memory)."""

STEFAN_BOLTZMANN = 5.670374419e-8
"""Stefan-Boltzmann constant [W/(m2 K4)]; CODATA 2018, exact in the SI of 2019 (from memory)."""

BOLTZMANN_EV = 8.617333262e-5
"""Boltzmann constant [eV/K]; CODATA 2018, exact in the SI of 2019 (from memory)."""

STANDARD_GRAVITY = 9.80665
"""Acceleration of free fall [m/s2]; 3rd CGPM, 1901, exact."""

ZERO_CELSIUS = 273.15
"""0 degC as thermodynamic temperature [K]; SI brochure, exact."""

COPPER_RESISTIVITY = 1.0 / 58.0e6
"""Resistivity of annealed copper at 20 degC [ohm m]; IEC 60028:1925."""

COPPER_TEMPERATURE_COEFFICIENT = 0.00393
"""Temperature coefficient of resistance of annealed copper at 20 degC [1/K]; IEC 60028:1925."""

COPPER_DENSITY = 8890.0
"""Density of annealed copper at 20 degC [kg/m3]; IEC 60028:1925 (from memory)."""

COPPER_REFERENCE_C = 20.0
"""Temperature of the copper values above [degC]; IEC 60028:1925."""

OERSTED = 1000.0 / (4.0 * math.pi)
"""One oersted as a field [A/m]; derived: 1 Oe = 1000/(4 pi) A/m."""

GAUSS = 1.0e-4
"""One gauss as a flux density [T]; exact."""
