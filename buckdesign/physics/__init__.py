"""Pure functions on floats and arrays, SI in and out.

Arguments broadcast against each other; scalars in, a scalar out. Temperatures named ``_c`` are in
degC. Each module keeps the ranges in which its models are trusted in ``RANGES`` (see
`buckdesign.physics.arrays.within`);
nothing is clamped to them.
"""
