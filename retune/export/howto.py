"""How to use.txt: what lies in the folder, and how to use it without harm."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

from retune.export.base import OutputFile
from retune.tracks.take import Take
from retune.tuning.model import TunedScore
from retune.tuning.policy import Drift, Temperament

NAME = "How to use.txt"
_WIDTH = 76

_DRIFT_WORDS = {
    Drift.FOLLOW: "Each chord follows purely from the one before; the piece goes where that leads.",
    Drift.WITHIN: "Each chord follows from the one before, but the home note stays within bounds.",
    Drift.GENTLE: "The piece is drawn gently back to its home note, so that it does not drift.",
    Drift.ANCHORED: "The piece is held firmly to its home note from beginning to end.",
}

_KINDS = (
    (
        "midi/",
        (
            "The whole piece as MIDI. Every synth or sequencer that obeys pitch bend plays it "
            "in tune: load it as it is, and do not merge or renumber its channels."
        ),
    ),
    (
        "tables/",
        (
            "Tuning tables (.scl with .kbm) for instruments and sequencers that load them. "
            "The plain one is the best single table; the numbered ones are exact, and the "
            ".csv says from which bar each applies."
        ),
    ),
    (
        "notes/",
        (
            "Every note with its chord, its ratio and its cents, for a spreadsheet (.csv) or "
            "a program (.json)."
        ),
    ),
)

_READING_CENTS = (
    "Cents are hundredths of a piano's semitone; + is higher than the piano's note, - is lower. "
    "A major third above its root sits about 14 cents lower than on a piano, a minor third about "
    "16 cents higher, a fifth 2 cents higher. A piano at home will not agree with these files, "
    "and need not: listen for the chord to stop beating."
)

LISTENING = (
    "Start with the volume low and turn it up only as far as you need. About 80 dB(A) for 40 "
    "hours a week is the limit the World Health Organization gives for adults, 75 dB(A) for "
    "children; every 3 dB more halves the time. Headphones reach that sooner than you think."
)

VOICE = (
    "Warm up before you sing, drink water, and rest your voice between repeats. Stop if it hurts "
    "or turns hoarse, and do not sing through hoarseness or illness. Do not force a pitch, a "
    "vowel or a volume to meet a number. Hoarse for more than two or three weeks, or pain, sudden "
    "loss of voice, or trouble breathing or swallowing: see a doctor. Your director and your "
    "teacher know your voice; these files do not, and give no medical advice."
)


def _paragraph(text: str, indent: str = "") -> str:
    return textwrap.fill(text, _WIDTH, initial_indent=indent, subsequent_indent=indent)


def _tuning_words(tuned: TunedScore) -> str:
    policy = tuned.policy
    if policy.temperament is not Temperament.JUST:
        return f"Tuned in {policy.temperament} temperament, for comparison."
    sevenths = " Dominant sevenths are tuned 4:5:6:7." if policy.prime_limit == 7 else ""
    return f"Tuned in just intonation. {_DRIFT_WORDS[policy.drift]}{sevenths}"


def _sections(tuned: TunedScore, names: Sequence[str]) -> Iterator[str]:
    title = tuned.score.title or tuned.score.stem
    yield f"{title}\n{'=' * min(len(title), _WIDTH)}"
    if tuned.score.composer:
        yield tuned.score.composer
    yield _paragraph(
        f"{_tuning_words(tuned)} The home note is {tuned.harmony.tonic.root.name}, "
        f"A4 is {tuned.policy.reference_hz:g} Hz."
    )
    yield "WHAT IS WHAT"
    for folder, words in _KINDS:
        if any(name.startswith(folder) for name in names):
            yield f"{folder}\n{_paragraph(words, '    ')}"
    if tuned.score.left_out:
        yield "WHAT WAS LEFT OUT"
        yield _paragraph(
            f"Not played: {', '.join(tuned.score.left_out)}. It doubles the voices for rehearsal; "
            "name it with --accompaniment to hear it."
        )
    yield "READING THE CENTS"
    yield _paragraph(_READING_CENTS)
    yield "YOUR EARS"
    yield _paragraph(LISTENING)
    yield "YOUR VOICE"
    yield _paragraph(VOICE)


def how_to_use(takes: Sequence[Take], files: Sequence[OutputFile]) -> OutputFile:
    """The text for a folder that holds these files."""
    text = "\n\n".join(_sections(takes[0].tuned, [file.name for file in files])) + "\n"
    return OutputFile(NAME, text.encode("utf-8"))
