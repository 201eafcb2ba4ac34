"""One chord as lines of text for a given width."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

import click

from retune.chordcard.found import FoundChord
from retune.chordcard.model import Tone, proportion
from retune.chordcard.others import (
    Alternative,
    Sound,
    alternatives,
    inversions,
    sound_equal,
    sound_here,
)
from retune.chordcard.vowels import DARKER, minor_third_rub, shared_by_voice
from retune.page.intervals import interval_name
from retune.voice.beats import Pair
from retune.voice.partials import HIGHEST_HZ, ordinal

_PAIRS = 12
_INTERVAL, _LONGEST = 26, 31
_BEATS = 3
_CLOSE_DB = 3.0


def chord_lines(chord: FoundChord, columns: int) -> Iterator[str]:
    """All that is to be said of a chord, in lines no wider than `columns`."""
    yield from _heading(chord, columns)
    yield ""
    yield from _tones(chord)
    if len({tone.pitch.key for tone in chord.tones}) == 1:
        yield ""
        yield from _alone(chord, columns)
        return
    yield ""
    yield from _pairs(chord, columns)
    yield ""
    yield from _roughness(chord, columns)
    for section in (_vowels(chord, columns), _alternatives(chord), _inversions(chord, columns)):
        lines = list(section)
        if lines:
            yield ""
            yield from lines


def title(chord: FoundChord) -> str:
    """What a chord is called: its root and quality, or its pitches."""
    reading = chord.reading
    if reading.quality is not None:
        words = f"{reading.root} {reading.quality}"
        if reading.added:
            words += f" with {' and '.join(reading.added)}"
        return words if reading.symbol == reading.root.name else f"{reading.symbol}, {words}"
    return _interval(chord)


def full_title(chord: FoundChord) -> str:
    """What a chord is called, and its pitches."""
    names = " ".join(pitch.name for pitch in chord.pitches)
    named = chord.reading.quality is not None or len(chord.tones) <= _TWO
    place = f"{chord.place}: " if chord.place else ""
    return f"{place}{title(chord)}: {names}" if named else f"{place}{names}"


_TWO = 2


def _interval(chord: FoundChord) -> str:
    keys = [tone.pitch.key for tone in chord.tones]
    if len(keys) == 1:
        return "one tone"
    if len(keys) == _TWO:
        return interval_name(keys[1] - keys[0]) if keys[1] > keys[0] else "unison"
    return ""


def _heading(chord: FoundChord, columns: int) -> Iterator[str]:
    for line in textwrap.wrap(full_title(chord), columns - 1):
        yield click.style(line, bold=True)
    words = [f"A4 = {chord.tones[0].reference_hz:g} Hz", f"{chord.limit}-limit"]
    numbers = proportion([tone.sounding for tone in chord.tones])
    if numbers is not None and len(numbers) > 1:
        words.insert(0, f"in whole numbers {':'.join(map(str, numbers))}")
    if abs(chord.root_cents) >= 0.05:
        words.append(f"its root {_signed(chord.root_cents)} cents from the piano's")
    if len(chord.tones) > _TWO and chord.reading.quality is None:
        words.append("no chord with a name")
        words.append(f"ratios are above {chord.reading.root}, the simplest of their spelling")
    yield from textwrap.wrap(", ".join(words), columns - 1)
    if chord.rivals:
        others = " or ".join(f"{one.symbol} (--root {one.root})" for one in chord.rivals)
        known = "It may also be"
        if chord.place:
            others = " or ".join(one.symbol for one in chord.rivals)
            known = "Its root is in doubt; it may also be"
        yield from textwrap.wrap(f"{known} {others}.", columns - 1)


def _here(chord: FoundChord) -> str:
    """What the chord's own tuning is called: in a score it need not be just."""
    return "here" if chord.place else "just"


def _signed(cents: float) -> str:
    text = f"{cents:+.1f}"
    return "0.0" if text in ("+0.0", "-0.0") else text


def _tones(chord: FoundChord) -> Iterator[str]:
    width = max(8, *(len(_short(tone.name)) for tone in chord.tones))
    off_piano = abs(chord.root_cents) >= 0.05
    above = "above root  " if off_piano else ""
    yield _head(
        f" {'voice':<{width}}  pitch  ratio        {above}cents    {_here(chord):>4} Hz   equal Hz"
    )
    for tone in reversed(chord.tones):
        ratio = tone.role or "tempered"
        if tone.ratio is not None:
            ratio = f"{_ratio(tone)}{'*' * bool(tone.role)}"
        relative = f"{_signed(tone.cents - chord.root_cents):>10}  " if off_piano else ""
        yield (
            f" {_short(tone.name):<{width}}  {tone.pitch.name:<5}  {ratio:<12} "
            f"{relative}{_signed(tone.cents):>5}  {tone.hz:>9.3f}  {tone.equal_hz:>9.3f}"
        )
    strangers = [tone for tone in chord.tones if tone.role]
    if strangers and any(tone.ratio is not None for tone in strangers):
        yield f" * {', '.join(dict.fromkeys(tone.role for tone in strangers))}"


def _short(name: str) -> str:
    return name if len(name) <= _NAME else name[: _NAME - 1] + "…"


_NAME = 16


def _ratio(tone: Tone) -> str:
    assert tone.ratio is not None
    return f"{tone.ratio.numerator}:{tone.ratio.denominator}"


def _head(text: str) -> str:
    return click.style(text.rstrip(), bold=True)


def _alone(chord: FoundChord, columns: int) -> Iterator[str]:
    tone = chord.tones[0]
    partials = ", ".join(f"{number * tone.hz:.0f}" for number in range(1, 9))
    if len(chord.tones) == 1:
        yield from _indented("One tone beats with nothing.", columns)
    yield from _unisons(chord, columns)
    yield from _indented(f"Its first partials lie at {partials} Hz.", columns)


def _pairs(chord: FoundChord, columns: int) -> Iterator[str]:
    card = chord.card
    shown = card.pairs[:_PAIRS]
    names = [_pair_words(chord, pair) for pair in shown]
    room = max([_INTERVAL, *map(len, names)])
    if shown:
        rates = f"{'equal':>6} {_here(chord):>6}"
        yield _head(f" {'pair':<9} {'interval':<{room}} {rates}  partials that meet, Hz")
    for pair, name in zip(shown, names, strict=True):
        low, high = chord.tones[pair.low].pitch, chord.tones[pair.high].pitch
        rates = f"{_beat(pair.equal_hz):>6} {_beat(pair.beat_hz):>6}"
        left = f" {f'{low} {high}':<9} {name:<{room}} {rates}"
        yield f"{left}  {_meeting(pair, columns - len(left) - 3)}"
    if shown:
        yield from _indented("Beats a second; 0 is still.", columns)
    left_out = _count_pairs(chord) - len(shown)
    if left_out:
        one = left_out == 1
        yield from _indented(
            f"Not listed: {left_out} pair{'' if one else 's'} that share{'s' * one} no low partial"
            f"{', or a higher one' * (len(shown) < len(card.pairs))}.",
            columns,
        )
    yield from _unisons(chord, columns)
    if len(chord.tones) < 3:
        return
    if card.whole is None:
        why = f"No partial below {HIGHEST_HZ:.0f} Hz is shared by all tones."
        if any(tone.ratio is None for tone in chord.tones):
            why = "Tempered tones share no partial exactly."
    else:
        each = [
            f"the {ordinal(number)} of {tone.pitch}"
            for number, tone in zip(card.whole.numbers, chord.tones, strict=True)
        ]
        why = f"All tones meet first at {card.whole.hz:.0f} Hz: {', '.join(each)}."
    yield from _indented(why, columns)


def _pair_words(chord: FoundChord, pair: Pair) -> str:
    size = chord.tones[pair.high].pitch.key - chord.tones[pair.low].pitch.key
    ratio = f"{pair.ratio.numerator}:{pair.ratio.denominator}"
    name = interval_name(size)
    if len(name) + len(ratio) >= _LONGEST:
        name = f"{name[: _LONGEST - len(ratio) - 2]}…"
    return f"{name} {ratio}"


def _count_pairs(chord: FoundChord) -> int:
    keys = [tone.pitch.key for tone in chord.tones]
    return sum(low != high for place, low in enumerate(keys) for high in keys[place + 1 :])


def _unisons(chord: FoundChord, columns: int) -> Iterator[str]:
    keys = [tone.pitch.key for tone in chord.tones]
    for tone in {
        tone.pitch.key: tone for tone in chord.tones if keys.count(tone.pitch.key) > 1
    }.values():
        rate = tone.hz * (2.0 ** (1.0 / 1200.0) - 1.0)
        yield from _indented(
            f"{tone.pitch} is sung in unison: each cent between the singers beats {rate:.2f} "
            "times a second.",
            columns,
        )


def _beat(hz: float) -> str:
    return "0" if hz < 0.005 else f"{hz:.2f}"


def _meeting(pair: Pair, room: int) -> str:
    words = [f"{s.low_partial}-{s.high_partial} {s.hz:.0f}" for s in pair.shared]
    while len(words) > 1 and len(", ".join(words)) > room:
        words.pop()
    return ", ".join(words)


def _indented(text: str, columns: int) -> Iterator[str]:
    yield from (f" {line}" for line in textwrap.wrap(text, columns - 2))


def _roughness(chord: FoundChord, columns: int) -> Iterator[str]:
    here, equal = sound_here(chord).roughness, sound_equal(chord).roughness
    share = here / equal - 1.0 if equal else 0.0
    less = (
        f"{abs(share):.0%} {'less' if share < 0 else 'more'}" if abs(share) >= 0.005 else "as much"
    )
    yield from _indented(
        f"Roughness: {equal:.2f} in equal temperament, {here:.2f} here, {less} (Plomp and "
        "Levelt's curve as Sethares 1993 fits it, six partials a tone; it compares tunings of "
        "one chord).",
        columns,
    )


def _vowels(chord: FoundChord, columns: int) -> Iterator[str]:
    shared = shared_by_voice(chord)
    rub = minor_third_rub(chord)
    if shared:
        yield _head(" Vowels that bring out a partial which two voices share")
    for one in shared:
        tone, other = chord.tones[one.tone], chord.tones[one.other]
        best, worst = one.vowels[0], one.vowels[-1]
        strong = [v for v in one.vowels if best.level_db - v.level_db <= _CLOSE_DB]
        near = f"formant {best.formant} of {best.vowel} at {best.formant_hz:.0f} Hz"
        also = "" if one.other_partial == 1 else f"the {ordinal(one.other_partial)} of "
        text = (
            f"{tone.name} {tone.pitch}: {ordinal(one.partial)} partial, {one.hz:.0f} Hz, which "
            f"meets {also}{other.pitch}: strongest on {' or '.join(v.vowel for v in strong)} "
            f"({near}), {best.level_db - worst.level_db:.0f} dB weaker on {worst.vowel}."
        )
        lines = textwrap.wrap(text, columns - 4)
        yield f" {lines[0]}"
        yield from (f"   {line}" for line in lines[1:])
    if chord.card.hint is not None:
        yield from _indented(chord.card.hint.words, columns)
    if rub is not None:
        bass, third = chord.tones[rub.bass], chord.tones[rub.third]
        low, high = DARKER
        yield from _indented(
            f"On a minor chord the 10th partial of {bass.name}'s {bass.pitch} ({rub.hz:.0f} Hz) is "
            f"the major third, {rub.cents:.1f} cents above the minor one of {third.name}: rather "
            f"a darker vowel, on the {ordinal(low)} or {ordinal(high)} (common practice, no "
            "source).",
            columns,
        )
    if shared or rub is not None:
        yield from _indented(
            "Formants: Bennett and Rodet 1989, a synthesis's, not measured. Acoustic hints, not "
            "vocal technique: director and teacher decide.",
            columns,
        )


def _alternatives(chord: FoundChord) -> Iterator[str]:
    found = alternatives(chord)
    if not found:
        return
    yield _head(
        f" {'other ratios':<17} {'what changes, cents':<29} {'roughness':>9}  beats a second"
    )
    for one in found:
        yield _sound_row(_numbers(one.numbers), _changes(one), one.sound)
    yield _sound_row("equal", "", sound_equal(chord))


def _numbers(numbers: Sequence[int]) -> str:
    return ":".join(map(str, numbers)) or "tempered"


def _changes(one: Alternative) -> str:
    if one.chosen:
        return "as here"
    words = []
    for degree, ratio, cents in one.differs:
        size = "tempered" if ratio is None else f"{ratio.numerator}:{ratio.denominator}"
        words.append(f"{degree} {size} ({_signed(cents)})")
    shown = words[:1] if len(", ".join(words)) > _CHANGE else words
    if len(shown) < len(words):
        return "all tones" if words[0].startswith("root") else f"{shown[0]} ..."
    return ", ".join(words)


_CHANGE = 29


def _sound_row(name: str, words: str, sound: Sound) -> str:
    return f" {name:<17} {words:<29} {sound.roughness:>9.2f}  {_beating(sound)}"


def _beating(sound: Sound) -> str:
    if not sound.beating:
        return "still"
    shown = " ".join(f"{hz:.1f}" for hz in sound.beating[:_BEATS])
    return shown + " ..." * (len(sound.beating) > _BEATS)


def _inversions(chord: FoundChord, columns: int) -> Iterator[str]:
    found = inversions(chord)
    if not found:
        return
    yield _head(
        f" {'other basses':<23} {'whole numbers':<15} {_here(chord):>6} {'equal':>6}  "
        "beats a second, equal"
    )
    for one in found:
        names = " ".join(pitch.name for pitch in one.pitches)
        if len(names) > 23:
            names = names[:22] + "…"
        numbers = _numbers(one.numbers) if len(_numbers(one.numbers)) <= 15 else "..."
        yield (
            f" {names:<23} {numbers:<15} {one.just.roughness:>6.2f} "
            f"{one.equal.roughness:>6.2f}  {_beating(one.equal)}"
        )
    yield from _indented("The two middle columns are roughness.", columns)
