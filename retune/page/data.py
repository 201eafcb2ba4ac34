"""All that the page's script needs to know of a piece, as plain values for JSON.

Conventions
-----------
* Times are seconds from the first beat of the piece by its tempo map, at the score's own tempo.
* Frequencies are in Hz at the policy's reference pitch; cents against equal temperament.
* Names are short where they occur once a note: `p` part, `t` time, `d` duration, `n` pitch name,
  `v` gain, `a` attack, `g` segments [time, just Hz, equal Hz, chord], `i` noteheads.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from retune.harmony.model import Quality
from retune.page.cards import cards
from retune.page.drift import drift_data
from retune.page.rehearsal import MOST_NOTES, concerning, hard_places, hardest
from retune.score.model import Part, PartKind, VoiceType
from retune.tracks.guides import first_chord, first_note
from retune.tracks.leadin import beats_of, lead_in
from retune.tuning.model import TunedNote, TunedScore
from retune.units import hz_of
from retune.voice.choir import type_of
from retune.voice.formants import formants
from retune.voice.loudness import gain_db
from retune.voice.spectrum import spectrum

_MOST_PARTIALS = 40
_KEYS_APART = 5
_RD = 1.1
_PLACES = 5
_SPREAD = 0.5
_OWN_NOTES = 6

LEGATO, DIP, ATTACK = 0, 1, 2
"""How a note begins: slurred on, with a new syllable, or from silence or on the same pitch."""


def page_data(
    tuned: TunedScore, follow: TunedScore, noteheads: Mapping[str, str]
) -> dict[str, Any]:
    """Everything for one piece.

    Parameters
    ----------
    tuned : TunedScore
    follow : TunedScore
        The same score tuned with `follow`: where pure steps lead.
    noteheads : mapping
        Ids of noteheads in the engraving by `Note.sources`; empty where there is none.
    """
    score = tuned.score
    return {
        "title": score.title or score.stem,
        "composer": score.composer,
        "reference": tuned.policy.reference_hz,
        "length": _seconds(tuned.seconds(score.end)),
        "parts": [_part(tuned, part) for part in score.parts],
        "bars": _bars(tuned),
        "notes": list(_notes(tuned, noteheads)),
        "chords": cards(tuned),
        "advice": [*_told(tuned), *_advice(tuned)],
        "qualities": [str(one) for one in Quality],
        "choices": f"{score.stem}.choices.toml",
        "start": _start(tuned),
        "drift": drift_data(tuned, follow),
    }


def _seconds(value: float) -> float:
    return round(value, 4)


def _part(tuned: TunedScore, part: Part) -> dict[str, Any]:
    voices = [one.index for one in tuned.score.parts if one.tuned]
    place = voices.index(part.index) if part.index in voices else 0
    wide = _SPREAD * (2 * place / (len(voices) - 1) - 1) if len(voices) > 1 else 0.0
    return {
        "name": part.name or f"Part {part.index + 1}",
        "short": part.abbreviation or (part.name or str(part.index + 1))[:3],
        "voice": part.tuned,
        "pan": round(wide if part.tuned else 0.0, 3),
        "waves": list(_waves(tuned, part)),
    }


def _waves(tuned: TunedScore, part: Part) -> Iterator[list[Any]]:
    """[Hz, amplitudes of the partials] at steps through the part's range, each of equal power.

    Singers have the choir voice's spectrum; other parts partials that fall off like 1/n^1.5.
    """
    keys = [note.pitch.key for note in tuned.score.notes if note.part == part.index]
    if not keys:
        return
    for key in range(min(keys), max(keys) + _KEYS_APART, _KEYS_APART):
        hz = hz_of(key, 0.0, tuned.policy.reference_hz)
        if part.kind is PartKind.VOICE:
            amplitudes = spectrum(hz, formants(_voice(part, keys), "neutral"), _RD).tolist()
        else:
            count = max(int(8000.0 / hz), 1)
            amplitudes = [n**-1.5 for n in range(1, count + 1)]
        amplitudes = amplitudes[:_MOST_PARTIALS]
        power = sum(a * a for a in amplitudes) ** 0.5
        yield [round(hz, 2), [round(a / power, _PLACES) for a in amplitudes]]


def _bars(tuned: TunedScore) -> list[dict[str, Any]]:
    """Each bar as played: printed number, written index, start, beats."""
    return [
        {
            "n": bar.number,
            "w": bar.written,
            "t": _seconds(tuned.seconds(bar.onset)),
            "mark": bar.rehearsal,
            "beats": [_seconds(tuned.seconds(onset)) for onset in beats_of(bar)],
            "full": bar.begins == 0,
        }
        for bar in tuned.score.bars
    ]


def _notes(tuned: TunedScore, noteheads: Mapping[str, str]) -> Iterator[dict[str, Any]]:
    last: dict[int, TunedNote] = {}
    for one in tuned.notes:
        note = one.note
        start, end = tuned.seconds(note.onset), tuned.seconds(note.end)
        row = {
            "p": note.part,
            "t": _seconds(start),
            "d": _seconds(end - start),
            "n": note.pitch.name,
            "v": round(10.0 ** (gain_db(note.velocity) / 20.0), 3),
            "a": _attack(last.get(note.part), one),
            "g": [
                [
                    _seconds(tuned.seconds(segment.onset)),
                    round(tuned.hz(one, segment), 4),
                    round(_equal_hz(tuned, one), 4),
                    segment.chord,
                ]
                for segment in one.segments
            ],
            "i": [noteheads[source] for source in note.sources if source in noteheads],
        }
        if note.lyric:
            row["l"] = note.lyric
        last[note.part] = one
        yield row


def _told(tuned: TunedScore) -> Iterator[dict[str, Any]]:
    """The director's notes to singers, one for each text, at all its bars."""
    score = tuned.score
    everybody = {part.index for part in score.parts if part.tuned}
    found: dict[tuple[str, tuple[int, ...]], list[list[Any]]] = {}
    for note in score.singer_notes:
        place = [score.bar_at(note.onset).number, _seconds(tuned.seconds(note.onset))]
        found.setdefault((note.text, note.parts), []).append(place)
    for (text, parts), places in found.items():
        yield {
            "kind": "director",
            "who": [] if set(parts) >= everybody else list(parts),
            "at": places,
            "what": "from your director",
            "text": text,
            "listen": "",
            "main": True,
        }


def _advice(tuned: TunedScore) -> list[dict[str, Any]]:
    """Rehearsal notes: what singers are told of the bars hardest to tune, in order.

    `kind` says who tells it, `who` are indices of parts, [] for all; `main` marks the hardest
    places of the piece, beside which each part has its own.
    """
    places = hard_places(tuned)
    main = hardest(places, MOST_NOTES)
    shown = set(main)
    for part in tuned.score.parts:
        if part.tuned:
            shown |= set(hardest(concerning(places, part.index), _OWN_NOTES))
    return [
        {
            "kind": "tuning",
            "who": list(note.parts),
            "at": [
                [bar, _seconds(tuned.seconds(onset))]
                for bar, onset in zip(note.bars, note.onsets, strict=True)
            ],
            "what": str(note.reason),
            "text": note.text,
            "listen": note.listen,
            "main": note in main,
        }
        for note in places
        if note in shown
    ]


def _equal_hz(tuned: TunedScore, one: TunedNote) -> float:
    return hz_of(one.note.pitch.key, 0.0, tuned.policy.reference_hz)


def _attack(before: TunedNote | None, one: TunedNote) -> int:
    note = one.note
    if before is None or before.note.end < note.onset or before.note.pitch == note.pitch:
        return ATTACK
    if before.note.marks & {"breath", "caesura", "fermata"}:
        return ATTACK
    return DIP if note.lyric else LEGATO


def _start(tuned: TunedScore) -> dict[str, Any]:
    """Starting notes of the first chord and of each part, and one bar of count-in."""
    lead = lead_in(tuned.score, 0, 0, 1)
    slot = float(lead_in(tuned.score, 0, 1, 0).slot * 60 / lead.silence.qpm)
    bar = tuned.score.bars[0]
    beat = float(bar.counted_beat * 60 / lead.silence.qpm)
    count = int(lead.duration / bar.counted_beat)
    full = int(bar.full_length / bar.counted_beat) or 1

    def hz(pitched: Any) -> list[Any]:
        pitch, cents = pitched
        reference = tuned.policy.reference_hz
        return [
            pitch.name,
            round(hz_of(pitch.key, cents, reference), 4),
            round(hz_of(pitch.key, 0.0, reference), 4),
        ]

    own = [first_note(tuned, part.index) for part in tuned.score.parts]
    return {
        "chord": [hz(pitched) for pitched in first_chord(tuned)],
        "own": [hz(pitched) if pitched else None for pitched in own],
        "slot": _seconds(slot),
        "beat": _seconds(beat),
        "count": [number % full == 0 for number in range(count)],
    }


def _voice(part: Part, keys: list[int]) -> VoiceType:
    return part.voice_type or type_of(sorted(keys)[len(keys) // 2])
