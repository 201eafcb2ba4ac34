"""One module for each third-party world, and the one writer to disk."""
