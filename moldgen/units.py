"""Units of measure: plain numbers are mm, deg, degC, MPa, N, s; text with a unit is converted."""
