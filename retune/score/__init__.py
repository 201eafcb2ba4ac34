"""The score as played: model, reading, spelling, playing order."""
