"""From written to sounding pitch, by the line of fifths.

Conventions
-----------
* `semitones` and `fifths` are added to the written pitch: a B flat clarinet has -2 and -2.
* A key signature moves by `fifths` too, so pitches keep their spelling within their key.
"""

from __future__ import annotations

from dataclasses import dataclass

from retune.pitch import Pitch, PitchClass

# Diatonic steps for 0 to 11 semitones up where a file gives none; the tritone is a fourth.
_STEPS = (0, 1, 1, 2, 2, 3, 3, 4, 5, 5, 6, 6)
_FIFTHS_OF_STEP = (0, 2, 4, -1, 1, 3, 5)
_SEMITONES_OF_STEP = (0, 2, 4, 5, 7, 9, 11)
_MOST_ALTERED = 2


@dataclass(frozen=True, slots=True)
class Transposition:
    """An interval from written to sounding pitch; `doubling` adds a line octaves away."""

    semitones: int = 0
    fifths: int = 0
    doubling: int = 0

    def within(self, key_fifths: int) -> Transposition:
        """The same interval, respelled where the sounding key would need over seven signs."""
        sounding = key_fifths + self.fifths
        if self.fifths == 0 or -7 <= sounding <= 7:
            return self
        turn = -12 if sounding > 7 else 12
        return Transposition(self.semitones, self.fifths + turn, self.doubling)

    def pitch(self, written: Pitch) -> Pitch:
        """The sounding pitch of a written one."""
        if self.semitones == 0 and self.fifths == 0:
            return written
        return Pitch.at_key(written.key + self.semitones, self.pitch_class(written.pitch_class))

    def pitch_class(self, written: PitchClass) -> PitchClass:
        """The sounding pitch class of a written one."""
        return PitchClass.from_fifths(written.fifths + self.fifths)


def interval(
    chromatic: int, diatonic: int | None, octaves: int, doubling: int
) -> tuple[Transposition, bool]:
    """A transposition from the numbers of a file, and whether they agree with each other.

    `diatonic` counts staff steps and may be missing; where it does not fit `chromatic`, the
    usual spelling of that many semitones is taken.
    """
    turns, inside = divmod(chromatic, 12)
    usual = _STEPS[inside]
    step, agrees = usual, True
    if diatonic is not None:
        step = diatonic - 7 * turns
        agrees = abs(chromatic - _semitones(diatonic)) <= _MOST_ALTERED
        if not agrees:
            step = usual
    altered = inside - _semitones(step)
    fifths = _FIFTHS_OF_STEP[step % 7] + 7 * altered
    return Transposition(chromatic + 12 * octaves, fifths, doubling), agrees


def _semitones(steps: int) -> int:
    octave, inside = divmod(steps, 7)
    return 12 * octave + _SEMITONES_OF_STEP[inside]
