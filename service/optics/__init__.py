"""Beams and the fraction of a beam inside an aperture. Pure: numpy and the standard library."""
