"""MusicXML to a `WrittenScore`.

================  ==============================================================
`read_musicxml`   bytes of a .musicxml, .xml or .mxl file to a `WrittenScore`
`noteheads`       the note elements of a parsed score, by `WrittenNote.source`
================  ==============================================================
"""

from retune.score.musicxml.layout import noteheads
from retune.score.musicxml.reader import read_musicxml

__all__ = ["noteheads", "read_musicxml"]
