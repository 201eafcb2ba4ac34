"""The choices file that is proposed for a score: the present analysis, to be decided on.

Every line but the parts' first notes is a comment, so that the file as written changes nothing;
taking the # away from the lines of a block decides it. Doubtful chords come first.
"""

from __future__ import annotations

import json
from collections.abc import Iterator, Sequence
from fractions import Fraction

from retune.choicesfile.partnames import melodies
from retune.choicesfile.schema import DECISIONS, PARTS, PIECE, PLAYING, TRACKS, TUNING, Table
from retune.harmony.model import Chord
from retune.harmony.symbols import chord_symbol, chord_words
from retune.score.model import Score
from retune.score.moments import Moment, moments_of
from retune.tuning.model import TunedScore

_RULE = "# " + "-" * 76
_MOST_DOUBTFUL = 40
_LONG_REST = Fraction(4)
"""Quarter notes of silence after which the pitch centre may be set anew."""


def proposed(tuned: TunedScore) -> str:
    """The text of the file for a score that was tuned without choices."""
    return "\n".join([*_lines(tuned), ""])


def _lines(tuned: TunedScore) -> Iterator[str]:
    score = tuned.score
    moments = moments_of(score)
    yield f"# Choices for {_one_line(score.title or score.stem)} ({score.file or score.stem})."
    yield "#"
    yield "# retune reads this file where it stands beside the score. Lines that begin with #"
    yield "# are asleep: take the # away from a line, or from all lines of a block, to decide it."
    yield "# Places are bar:beat, as printed. `sounds` is what sounds before | at | after a place:"
    yield "# by it a decision finds its music again when bars move. Where you add one by hand,"
    yield "# leave it out; `retune choices SCORE --update` writes it."
    yield ""
    yield from _settings(PIECE, {"title": _text(score.title or score.stem), "reference": "440"})
    yield from _doubtful(tuned, moments)
    yield from _heading("The piece")
    yield "[tuning]"
    tonic = tuned.policy.tonic or tuned.harmony.tonic.root
    yield from _settings(TUNING, _policy(tuned, tonic.name))
    yield "[playing]"
    yield from _settings(PLAYING, _playing(score))
    yield from _heading("The parts")
    yield from _parts(score)
    yield "[tracks]"
    yield from _settings(TRACKS, _TRACKS)
    yield from _heading("More decisions; copy a block as often as you need it")
    yield from _blocks(tuned, moments)


def _heading(words: str) -> Iterator[str]:
    yield from (_RULE, f"# {words}", "")


def _settings(table: Table, values: dict[str, str]) -> Iterator[str]:
    """Settings asleep, each with what it means."""
    helps = table
    width = max(len(f"{name} = {value}") for name, value in values.items())
    for name, value in values.items():
        line = f"# {name} = {value}"
        yield f"{line:<{min(width, 34) + 2}}  # {helps[name].help}"
    yield ""


def _policy(tuned: TunedScore, tonic: str) -> dict[str, str]:
    policy = tuned.policy
    return {
        "prime_limit": str(policy.prime_limit),
        "drift": _text(str(policy.drift)),
        "held_shift": f"{policy.held_shift:g}",
        "tonic": _text(tonic),
    }


def _playing(score: Score) -> dict[str, str]:
    beat = score.bars[0].counted_beat if score.bars else Fraction(1)
    beats = float(score.tempo.changes[0].qpm / beat)
    return {
        "tempo": f"{beats:.4g}",
        "repeats": "true",
        "fermatas": "true",
        "transpose": "0",
    }


_TRACKS = {
    "audio": '"mp3"',
    "starting_notes": '"chord"',
    "count_in": "1",
    "click": "true",
    "drone": '"tonic"',
    "sides": "true",
    "language": '"latin"',
    "others": "-9.0",
}


def _parts(score: Score) -> Iterator[str]:
    names = [part.name for part in score.parts]
    if not names:
        return
    fixed = [part.name for part in score.parts if not part.tuned]
    first = names[0]
    yield "[parts]"
    yield from _settings(
        PARTS,
        {
            "order": _list(names),
            "names": f"{{ {_text(first)} = {_text(first + ' 1')} }}",
            "accompaniment": _list(fixed or names[-1:]),
            "doubled": _list(score.left_out or names[-1:]),
            "melody": _text(first),
        },
    )
    yield f"[parts.begins]  # {PARTS['begins'].help}"
    for name, line in melodies(score).items():
        if line:
            yield f"{_text(name)} = {_text(' '.join(pitch.name for pitch in line))}"
    yield ""


def _doubtful(tuned: TunedScore, moments: Sequence[Moment]) -> Iterator[str]:
    chords = [one for one in tuned.harmony.chords if one.doubtful and not one.decided]
    chords.sort(key=lambda one: (one.confidence, one.onset))
    by_moment: dict[int, Chord] = {}
    for one in chords:
        moment = _moment(tuned.score, moments, one)
        if moment is not None:
            by_moment.setdefault(moment.index, one)
    if not by_moment:
        yield from _heading("No chord is in doubt")
        return
    more = len(by_moment) - _MOST_DOUBTFUL
    listed = f"; the first {_MOST_DOUBTFUL} of {len(by_moment)}" if more > 0 else ""
    yield from _heading(f"Chords in doubt, the most doubtful first{listed}")
    for index, chord in list(by_moment.items())[:_MOST_DOUBTFUL]:
        yield from _chord(chord, moments[index])


def _chord(chord: Chord, moment: Moment) -> Iterator[str]:
    """A chord as it is read, or the next likely reading in its place."""
    root, quality = chord.root, chord.quality
    also = ""
    if chord.runner_up is not None:
        root, quality = chord.runner_up
        also = f"; {chord_words(*chord.runner_up)} is next likely"
    yield (f"# {moment.at} is read as {chord_symbol(chord)}, {chord.confidence:.0%} sure{also}:")
    if root is None or quality is None:
        return
    yield "# [[chord]]"
    yield f'# at = "{moment.at}"'
    yield f'# root = "{root.name}"'
    yield f'# quality = "{quality}"'
    yield f'# sounds = "{moment.sounds}"'
    yield ""


def _moment(score: Score, moments: Sequence[Moment], chord: Chord) -> Moment | None:
    bar = score.bar_at(chord.onset)
    inside = chord.onset - bar.onset
    own = [one for one in moments if one.written == bar.written and one.inside <= inside]
    return own[-1] if own and own[-1].inside == inside else None


def _blocks(tuned: TunedScore, moments: Sequence[Moment]) -> Iterator[str]:
    """One example of every kind of decision, at places of this score, asleep."""
    score = tuned.score
    if not moments:
        return
    middle = moments[len(moments) // 2]
    sung = [part.name for part in score.parts if part.tuned] or [p.name for p in score.parts]
    bars = f"{moments[0].bar}-{middle.bar}" if moments[0].bar != middle.bar else middle.bar
    rest = _after_rest(score, moments) or middle
    values = {
        "at": _text(middle.at),
        "bars": _text(bars),
        "root": '"D"',
        "quality": '"minor"',
        "limit": "7",
        "part": _text(sung[0]),
        "parts": _list(sung[:1]),
        "ratio": '"3/2"',
        "prime_limit": "7",
        "drift": '"anchored"',
        "held_shift": '"none"',
        "melody": _text(sung[0]),
        "pitch": '"D"',
        "cents": "0.0",
        "tonic": '"D"',
        "beats": "1",
        "hold": "2.0",
        "pass": "2",
        "text": '"Lean on the bass here."',
    }
    special = {
        ("centre", "at"): _text(rest.at),
        ("tempo", "beats"): "72",
    }
    for name, table in DECISIONS.items():
        yield f"# [[{name}]]"
        for key, setting in table.items():
            if key in ("sounds", "ends"):
                continue
            value = special.get((name, key), values[key])
            yield f"{f'# {key} = {value}':<36}  # {setting.help}"
        yield ""


def _after_rest(score: Score, moments: Sequence[Moment]) -> Moment | None:
    """Where the voices come in again after the first long rest."""
    ends = Fraction(0)
    for note in score.notes:
        if ends and note.onset - ends >= _LONG_REST:
            bar = score.bar_at(note.onset)
            inside = note.onset - bar.onset
            own = (m for m in moments if (m.written, m.inside) == (bar.written, inside))
            return next(own, None)
        ends = max(ends, note.end)
    return None


def _text(text: str) -> str:
    """A text in quotes, as TOML and JSON both have it."""
    return json.dumps(_one_line(text), ensure_ascii=False)


def _one_line(text: str) -> str:
    return " ".join("".join(c if c.isprintable() else " " for c in text).split())


def _list(names: Sequence[str]) -> str:
    return "[" + ", ".join(_text(name) for name in names) + "]"
