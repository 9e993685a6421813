"""Preset text to `Job`: every fault reported at once; the only gates for numbers, text, names and artwork."""
