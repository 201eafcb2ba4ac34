"""Ratios, targets and tuned pitches."""
