"""Design of self-oscillating step-down supplies built from a three-terminal adjustable regulator."""

__version__ = "0.1.0"
