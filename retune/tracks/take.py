"""A take: one mix of a tuned score that an exporter turns into a file.

Conventions
-----------
* Gains are in dB, 0 for a part as loud as its dynamics say; pan goes from -1 (left) to 1 (right).
"""

from __future__ import annotations

from dataclasses import dataclass

from retune.tuning.model import TunedScore


@dataclass(frozen=True, slots=True)
class Strip:
    """How one part stands in a mix."""

    gain_db: float = 0.0
    pan: float = 0.0


@dataclass(frozen=True)
class Take:
    """One mix.

    Parameters
    ----------
    tuned : TunedScore
        The music alone, the same in all takes of a piece: for tables, lists and pages.
    name : str
        What the file is called before NAME ("Full mix", "Alto predominant").
    folder : str
        Where it goes below the exporter's own folder, "" for none.
    lead_in : TunedScore or None
        The music with what a singer practises by: starting notes, count-in, click and drone
        are parts of it, the bars of the lead-in its first; None where there is none.
    strips : tuple of Strip or None
        One for each part of `played`, None for a silent part; empty for a plain mix.
    sides : bool
        Whether left and right stand against each other, so that both must be equally loud.
    track, of : int
        The place among the learning tracks of a piece, from 0, and the number of the last one.
    """

    tuned: TunedScore
    name: str = "Full mix"
    folder: str = ""
    lead_in: TunedScore | None = None
    strips: tuple[Strip | None, ...] = ()
    sides: bool = False
    track: int = 0
    of: int = 0

    @property
    def played(self) -> TunedScore:
        """All that sounds: the music, with the lead-in and guide parts where there are any."""
        return self.tuned if self.lead_in is None else self.lead_in

    def strip(self, part: int) -> Strip | None:
        """How a part of `played` stands in the mix; None for silence."""
        return self.strips[part] if self.strips else Strip()
