"""What there is to know of one chord: of a tuned score, or of pitches alone."""
