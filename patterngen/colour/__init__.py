"""Inks and overprints to XYZ and CIELAB; what screens show of them."""
