"""Inks and overprints as XYZ and CIELAB, and what a mixture of them reflects."""
