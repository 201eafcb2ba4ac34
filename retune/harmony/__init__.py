"""Slices, roots and qualities, non-chord tones."""
