"""What an MPE instrument makes of a file (M1-100-UM v1.1; handbook, standards.md 3)."""

from __future__ import annotations

import pytest

from retune.adapters.midi import Bend, Control, Event, NoteOff, NoteOn, Program, RawMidi, RawTrack
from retune.errors import OutputError
from retune.export.mpe_receiver import heard_in_zone


def rpn(channel: int, number: int, value: int) -> list[Event]:
    return [Control(channel, 101, 0), Control(channel, 100, number), Control(channel, 6, value)]


def heard(*events: Event) -> list[float]:
    """Pitches of the notes, each as it is when it ends."""
    raw = RawMidi(1, 480, (RawTrack(tuple((n, event) for n, event in enumerate(events))),))
    return [note.last for note in heard_in_zone(raw)]


ZONE = rpn(0, 6, 7)
NOTE: list[Event] = [NoteOn(1, 60, 80), NoteOff(1, 60)]


def test_the_worked_value() -> None:
    """C.3: 9387 is 7 semitones at the range of 48 that the configuration message sets; by the
    straight line it is 7.0020."""
    assert heard(*ZONE, Bend(1, 9387), *NOTE) == [pytest.approx(67.0, abs=0.003)]


def test_the_range_of_one_member_is_that_of_all() -> None:
    """2.2.5: members may not differ; the last range holds."""
    assert heard(*ZONE, *rpn(2, 0, 24), Bend(1, 12288), *NOTE) == [72.0]


def test_a_later_configuration_takes_ranges_back() -> None:
    assert heard(*rpn(1, 0, 2), *ZONE, Bend(1, 12288), *NOTE) == [84.0]


def test_the_managers_bend_is_added() -> None:
    """C.1; the manager's range is 2 semitones unless it is told another."""
    assert heard(*ZONE, Bend(0, 12288), Bend(1, 0), *NOTE) == [60 + 1 - 48]
    on, off = NOTE
    assert heard(*ZONE, on, Bend(0, 12288), off) == [61.0]


def test_a_released_note_is_not_bent() -> None:
    """2.2.6."""
    assert heard(*ZONE, *NOTE, Bend(1, 0)) == [60.0]


@pytest.mark.parametrize(
    ("events", "words"),
    [
        ([*NOTE], "no member"),
        ([*ZONE, NoteOn(8, 60, 80)], "no member"),
        ([*ZONE, Program(1, 3)], "is a member and is sent"),
        ([*ZONE, NOTE[0], NOTE[0]], "struck twice"),
        ([*ZONE, NOTE[0]], "never released"),
        ([*ZONE, NOTE[0], *rpn(0, 6, 7)], "configured while notes sound"),
    ],
)
def test_what_the_specification_forbids(events: list[Event], words: str) -> None:
    with pytest.raises(OutputError, match=words):
        heard(*events)
