"""The rehearsal page: one HTML file that shows the score with its cents and plays it."""
