"""Just-intonation targets for every note of a choral score."""
