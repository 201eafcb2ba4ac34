"""MIDI to a `WrittenScore`.

===========  =================================================
`read_midi`  bytes of a Standard MIDI File to a `WrittenScore`
===========  =================================================
"""

from retune.score.midi.reader import read_midi

__all__ = ["read_midi"]
