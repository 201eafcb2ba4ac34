"""What makes single places hard to tune, reason by reason.

Conventions
-----------
* Each function yields the notes of one reason, every place by itself; thresholds are our choice
  unless a source is named.
"""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import pairwise

from retune.harmony.model import Chord, Degree, Role
from retune.harmony.symbols import chord_symbol, symbol_of
from retune.page.intervals import interval_name
from retune.page.rehearsal import Reason, RehearsalNote
from retune.page.rehearsal_view import Sung, View
from retune.score.model import Note
from retune.score.ranges import RANGES
from retune.tuning.model import TunedScore
from retune.tuning.ratios import AUGMENTED_SIXTH, templates
from retune.units import ratio_to_cents

LEAST_SECONDS = 0.5
"""Shorter chords cannot be tuned by ear (handbook, voice.md 6.5)."""

FAR_CENTS = 10.0
"""From here on a note stands far from where a piano has it: thirds, natural sevenths."""

_PULL, _MOVE, _AGAIN, _STRAYED = 10.0, 4.0, 5.0, 5.0
_LARGE, _AWKWARD = 7, frozenset({6, 10, 11})
_LONG_SECONDS = 2.0
_LOUD = 96
_REST_SECONDS, _REST_BARS = 4.0, 2


def found(tuned: TunedScore) -> Iterator[RehearsalNote]:
    """Every place that any reason finds."""
    view = View(tuned)
    for part in view.lines:
        yield from _held(view, part)
        yield from _melodic(view, part)
        yield from _thirds(view, part)
        yield from _sevenths(view, part)
        yield from _entries(view, part)
        yield from _range(view, part)
    yield from _doubts(view)


def _note(
    view: View, reason: Reason, onset: Fraction, part: int | None, severity: float, text: str,
    listen: str,
) -> RehearsalNote:  # fmt: skip
    score = view.tuned.score
    parts = () if part is None else (part,)
    bars = (score.bar_at(onset).number,)
    return RehearsalNote(
        reason, (onset,), bars, score.beat_at(onset), parts, severity, text, listen.strip()
    )


def _cents(cents: float) -> str:
    whole = round(abs(cents))
    return f"{whole} cent{'' if whole == 1 else 's'}"


def _comma(cents: float) -> str:
    return f"a comma ({_cents(cents)})" if 20.0 < abs(cents) < 23.0 else _cents(cents)


def _higher(cents: float) -> str:
    return "higher" if cents > 0 else "lower"


def _member(one: Sung) -> str:
    """Which tone of which chord a note is, as "the third of D"."""
    return f"the {one.degree} of {one.symbol}"


def _off(one: Sung) -> str:
    return f"{_cents(one.off)} {_higher(one.off)} above the root than a piano has it"


def _article(noun: str) -> str:
    return "an" if noun[0] in "aeiou" else "a"


def _held(view: View, part: int) -> Iterator[RehearsalNote]:
    """Notes held into a chord whose place asks for another pitch, by a comma or so."""
    for index in view.lines[part]:
        stretches = [view.sung(index, segment) for segment in view.tuned.notes[index].segments]
        for before, here in pairwise(stretches):
            if before is None or here is None or before.chord is here.chord:
                continue
            pull = view.place(here) - view.place(before)
            moved = here.segment.cents - before.segment.cents
            if min(before.seconds, here.seconds) < LEAST_SECONDS:
                continue
            if abs(pull) < _PULL and abs(moved) < _MOVE:
                continue
            text = f"{here.name} is held from {before.symbol} into {here.symbol}"
            way = "up" if moved > 0 else "down"
            stays = abs(moved) < 0.5
            if abs(pull) >= _PULL:
                text += f", whose own place in the scale has it {_comma(pull)} {_higher(pull)}. "
                text += "It stays" if stays else f"It moves {way} by {_cents(moved)}"
                text += "; the others do the rest."
            else:
                text += f", and moves {way} by {_cents(moved)}."
            listen = "Hold it still." if stays else f"Let it ease {way}, no more than that."
            severity = max(abs(pull), 2.0 * abs(moved))
            onset = here.segment.onset
            listen = f"{listen} {view.reference(here)}"
            yield _note(view, Reason.HELD, onset, part, severity, text, listen)


def _melodic(view: View, part: int) -> Iterator[RehearsalNote]:
    """Leaps into notes far from equal, and repeated notes that return elsewhere."""
    for first, second in pairwise(view.lines[part]):
        one, other = view.tuned.notes[first].note, view.tuned.notes[second].note
        beat = view.tuned.score.bar_at(other.onset).beat_length
        here = view.sung(second, view.tuned.notes[second].segments[0])
        if here is None or here.seconds < LEAST_SECONDS or other.onset - one.end > beat:
            continue
        if one.pitch.key == other.pitch.key:
            yield from _repeated(view, part, first, here)
        else:
            yield from _leap(view, part, one, here)


def _repeated(view: View, part: int, first: int, here: Sung) -> Iterator[RehearsalNote]:
    last = view.tuned.notes[first].segments[-1]
    moved = here.segment.cents - last.cents
    if abs(moved) < _AGAIN:
        return
    before = chord_symbol(view.tuned.harmony.chords[last.chord])
    where = f" over {here.symbol}" if before == here.symbol else f", now over {here.symbol}"
    text = (
        f"{here.name} is sung again{where}, and {_cents(moved)} {_higher(moved)} than just before."
    )
    listen = f"Do not copy the note before. {view.reference(here)}"
    yield _note(view, Reason.REPEATED, here.segment.onset, part, 1.5 * abs(moved), text, listen)


def _leap(view: View, part: int, before: Note, here: Sung) -> Iterator[RehearsalNote]:
    distance = here.note.note.pitch.key - before.pitch.key
    size = abs(distance)
    awkward = size in _AWKWARD or size > 12
    if (size < _LARGE and not awkward) or abs(here.off) < FAR_CENTS:
        return
    name = interval_name(size)
    text = (
        f"Leap of {_article(name)} {name} "
        f"{'up' if distance > 0 else 'down'} to {here.name}, {_member(here)}: {_off(here)}."
    )
    severity = abs(here.off) + size - 5.0 + 4.0 * awkward + 2.0 * min(here.seconds, 3.0)
    listen = view.reference(here)
    yield _note(view, Reason.LEAP, here.segment.onset, part, severity, text, listen)


def _thirds(view: View, part: int) -> Iterator[RehearsalNote]:
    """Thirds on top, long ones in the bass, and those that come while all others stay."""
    for index in view.lines[part]:
        for segment in view.tuned.notes[index].segments:
            one = view.sung(index, segment)
            if one is None or one.degree is not Degree.THIRD or abs(one.off) < FAR_CENTS:
                continue
            if one.seconds < 2 * LEAST_SECONDS:
                continue
            beside = view.beside(one)
            if len(beside) < 2:
                continue
            keys = [note.note.pitch.key for note, _ in beside.values()]
            own = one.note.note
            long = one.seconds >= _LONG_SECONDS
            top, bottom = own.pitch.key > max(keys), own.pitch.key < min(keys) and long
            alone = segment.onset == own.onset and all(
                note.note.onset < segment.onset for note, _ in beside.values()
            )
            if not (top or bottom or alone):
                continue
            how = "lies on top" if top else "lies in the bass" if bottom else "moves there alone"
            how += f", for {one.seconds:.0f} seconds" if long else ""
            text = f"{own.pitch.name}, {_member(one)}, {how}: {_off(one)}."
            severity = abs(one.off) * 0.6 + 2.0 * min(one.seconds, 5.0) + 4.0 * top + 3.0 * alone
            severity += 3.0 * (own.velocity >= _LOUD)
            listen = view.reference(one)
            yield _note(view, Reason.THIRD, segment.onset, part, severity, text, listen)


def _sevenths(view: View, part: int) -> Iterator[RehearsalNote]:
    """Sevenths that stand elsewhere than in most such chords, for a held note's sake."""
    for index in view.lines[part]:
        for segment in view.tuned.notes[index].segments:
            one = view.sung(index, segment)
            if one is None or one.degree is not Degree.SEVENTH or one.seconds < LEAST_SECONDS:
                continue
            assert one.chord.quality is not None
            assert segment.ratio is not None
            assert one.chord.root is not None
            sixth = one.note.note.pitch.pitch_class.fifths - one.chord.root.fifths
            usual = templates(one.chord.quality, view.limit, sixth == AUGMENTED_SIXTH)[0].ratios
            if usual is None or len(usual) < 4 or usual[3] == segment.ratio:
                continue
            apart = ratio_to_cents(segment.ratio) - ratio_to_cents(usual[3])
            text = (
                f"{one.name}, {_member(one)}, stands at {_ratio(segment.ratio)}, not at "
                f"{_ratio(usual[3])}: {_cents(apart)} {_higher(apart)} than in most such chords."
            )
            severity = abs(apart) * 0.5 + 2.0 * min(one.seconds, 3.0)
            listen = view.reference(one)
            yield _note(view, Reason.SEVENTH, segment.onset, part, severity, text, listen)


def _ratio(ratio: Fraction) -> str:
    return f"{ratio.numerator}:{ratio.denominator}"


def _entries(view: View, part: int) -> Iterator[RehearsalNote]:
    """Entries after a rest during which the choir's pitch has moved."""
    tuned, line = view.tuned, view.lines[part]
    ends = [Fraction(0), *(tuned.notes[index].note.end for index in line)]
    for end, index in zip(ends, line, strict=False):
        note = tuned.notes[index].note
        bars = tuned.score.bar_at(note.onset).index - tuned.score.bar_at(end).index
        rest = tuned.seconds(note.onset) - tuned.seconds(end)
        if rest < _REST_SECONDS or bars < _REST_BARS:
            continue
        strayed = view.tonic_at(note.onset) - view.tonic_at(end)
        here = view.sung(index, tuned.notes[index].segments[0])
        if abs(strayed) < _STRAYED or here is None:
            continue
        since = "when this part last sang" if end else "at the beginning"
        text = (
            f"Comes in on {here.name} after a long rest: the choir's pitch lies "
            f"{_cents(strayed)} {_higher(strayed)} than {since}."
        )
        listen = f"Take the note from the choir, not from memory. {view.reference(here)}"
        yield _note(view, Reason.ENTRY, note.onset, part, 2.0 * abs(strayed), text, listen)


def _range(view: View, part: int) -> Iterator[RehearsalNote]:
    """The notes furthest beyond either edge of the voice's usual range, or at it, that last."""
    voice = view.tuned.score.parts[part].voice_type
    if voice is None:
        return
    low, high = RANGES[voice]
    long = [
        index
        for index in view.lines[part]
        if view.seconds(view.tuned.notes[index]) >= 2 * LEAST_SECONDS
    ]
    keys = {index: view.tuned.notes[index].note.pitch.key for index in long}
    for edge, limit, up in (("top", high, 1), ("bottom", low, -1)):
        furthest = max((up * key for key in keys.values()), default=0)
        beyond = furthest - up * limit
        if not keys or beyond < 0:
            continue
        where = f"{beyond} semitone{'s' * (beyond > 1)} beyond" if beyond else "at"
        for index in [index for index in long if up * keys[index] == furthest]:
            one = view.tuned.notes[index]
            text = (
                f"{one.note.pitch.name} lies {where} the {edge} of the usual range of "
                f"{_article(voice)} {voice}."
            )
            here = view.sung(index, one.segments[0])
            listen = f"Do not press it. {view.reference(here) if here is not None else ''}"
            severity = 10.0 + 2.0 * beyond + min(view.seconds(one), 4.0)
            yield _note(view, Reason.RANGE, one.note.onset, part, severity, text, listen)


def _doubts(view: View) -> Iterator[RehearsalNote]:
    """Chords whose next likely reading has a voice elsewhere, or other voices in the chord."""
    for chord in view.tuned.harmony.chords:
        seconds = view.tuned.seconds(chord.end) - view.tuned.seconds(chord.onset)
        if not chord.doubtful or chord.runner_up is None or seconds < LEAST_SECONDS:
            continue
        doubt = _elsewhere(view, chord) or _stranger(view, chord)
        if doubt is None:
            continue
        apart, what, listen = doubt
        symbol, other = chord_symbol(chord), symbol_of(*chord.runner_up)
        text = f"{symbol} or {other}? The root is in doubt. {what}"
        severity = max(abs(apart), 8.0) * (1.0 - chord.confidence) + 2.0 * min(seconds, 3.0)
        yield _note(view, Reason.DOUBT, chord.onset, None, severity, text, listen)


def _elsewhere(view: View, chord: Chord) -> tuple[float, str, str] | None:
    """The voice that the other reading moves furthest above the lowest one: cents and words."""
    assert chord.runner_up is not None
    root, quality = chord.runner_up
    template = templates(quality, view.limit)[0]
    row = view.rows[chord.index]
    moved: dict[int, float] = {}
    for part, (note, segment) in row.items():
        degree = (note.note.pitch.key - root.chroma) % 12
        if part in view.lines and segment.ratio is not None and degree in template.semitones:
            moved[part] = template.cents[template.semitones.index(degree)] - segment.cents
    bass = min(row, key=lambda part: (row[part][0].note.pitch.key, part), default=-1)
    if bass not in moved:
        return None
    part = max(moved, key=lambda one: (round(abs(moved[one] - moved[bass]), 6), -one))
    apart = moved[part] - moved[bass]
    if abs(apart) < _AGAIN:
        return None
    name, low = (f"{view.part(p)}'s {row[p][0].note.pitch.name}" for p in (part, bass))
    other = symbol_of(root, quality)
    what = f"As {other}, {name} stands {_comma(apart)} {_higher(apart)} above {low}."
    listen = f"Sing {name} both ways above {low}, and keep the one that stands stiller."
    return apart, what, listen


def _stranger(view: View, chord: Chord) -> tuple[float, str, str] | None:
    """A voice that is a tone of the chord in one of the two readings alone."""
    assert chord.runner_up is not None
    root, quality = chord.runner_up
    chromas = {(root.chroma + step) % 12 for step in templates(quality, view.limit)[0].semitones}
    for part, (note, segment) in sorted(view.rows[chord.index].items()):
        here, there = segment.role is Role.CHORD_TONE, note.note.pitch.key % 12 in chromas
        if part in view.lines and here != there:
            name = f"{view.part(part)}'s {note.note.pitch.name}"
            symbol = chord_symbol(chord) if here else symbol_of(root, quality)
            return (
                0.0,
                f"{name} belongs to {symbol} alone.",
                f"Sing the chord without {name}, until it stands still, then put it in.",
            )
    return None
