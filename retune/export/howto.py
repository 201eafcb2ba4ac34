"""How to use.txt: what lies in the folder, and how to use it without harm."""

from __future__ import annotations

import textwrap
from collections.abc import Iterator, Sequence

from retune.export.base import Output, OutputFile
from retune.score.model import Note
from retune.tracks.guides import DRONE, STARTING_NOTES
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
        ".html",
        (
            "The rehearsal page: open it in any web browser, on a phone too; it needs no network. "
            "It shows the score with its cents, plays any part against the others, slow or loud, "
            "just or as on a piano, and tells of each chord how it is tuned. The pages with a "
            "part in their name are the same with that part chosen."
        ),
    ),
    (
        "tracks/",
        (
            "Sound files to practise with. The full mix has everybody. In your own folder: "
            "predominant, your part in front of the others; alone, only your part (over the "
            "accompaniment, if there is one); missing, all but your part, for you to sing. They "
            "all start together and run equally long, so that they can be lined up."
        ),
    ),
    (
        "midi/",
        (
            "The same as MIDI. Every synth or sequencer that obeys pitch bend plays it "
            "in tune: load it as it is, and do not merge or renumber its channels."
        ),
    ),
    (
        "notation/",
        (
            "The score with its cents, as MusicXML for your notation program, and each part by "
            "itself. Small numbers at the notes count from the root of the chord: select one, "
            "then all like it, to move, hide or delete them."
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

_BEFORE = (
    "Before the music you hear the notes of the first chord from the bottom up, then your own "
    "first note, even if you enter later. The full mix leaves your own note out."
)
_TONIC_BEFORE = "Before the music you hear the home note."
_SIDES = (
    "In the tracks with left and right in their names your part is in one ear and the others in "
    "the other. Use them to find your line; to hear whether a chord beats, both must reach the "
    "same ear, so take another track for that."
)
_COMPARE = (
    "The last track plays a passage twice: first as it is tuned here, then, after a pause, in "
    "the piano's equal temperament."
)
_TUNED_LIKE = (
    "Sing with the track softly at first, and listen for the chord to lock: the roughness goes, "
    "and the sound stands still. The voice holds one vowel unless it was asked to follow the "
    "words; sing your own words, not its vowel."
)

READING_CENTS = (
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


def tuning_words(tuned: TunedScore) -> str:
    """How a piece is tuned, in a director's words."""
    policy = tuned.policy
    if policy.temperament is not Temperament.JUST:
        return f"Tuned in {policy.temperament} temperament, for comparison."
    sevenths = " Dominant sevenths are tuned 4:5:6:7." if policy.prime_limit == 7 else ""
    return f"Tuned in just intonation. {_DRIFT_WORDS[policy.drift]}{sevenths}"


def _practising(takes: Sequence[Take]) -> Iterator[str]:
    """How to use the tracks, by what is in them."""
    guides = {part.name: part for take in takes for part in take.played.score.parts if part.guides}
    if STARTING_NOTES in guides:
        alone = {len(_starting(take)) for take in takes} == {1}
        yield _TONIC_BEFORE if alone else _BEFORE
    if DRONE in guides:
        yield "A drone is held below the music. It moves with the tuned pitch."
    yield _TUNED_LIKE
    if any(take.sides for take in takes):
        yield _SIDES
    if any(take.lead_in is not None and not take.folder and take.track for take in takes):
        yield _COMPARE


def _starting(take: Take) -> list[Note]:
    """The starting notes of a take."""
    parts = take.played.score.parts
    return [n for n in take.played.score.notes if parts[n.part].name == STARTING_NOTES]


def _sections(takes: Sequence[Take], names: Sequence[str]) -> Iterator[str]:
    tuned = takes[0].tuned
    title = tuned.score.title or tuned.score.stem
    yield f"{title}\n{'=' * min(len(title), _WIDTH)}"
    if tuned.score.composer:
        yield tuned.score.composer
    yield _paragraph(
        f"{tuning_words(tuned)} The home note is {tuned.harmony.tonic.root.name}, "
        f"A4 is {tuned.policy.reference_hz:g} Hz."
    )
    yield "WHAT IS WHAT"
    for folder, words in _KINDS:
        own = [name for name in names if name.startswith(folder) or name.endswith(folder)]
        if own:
            yield f"{own[0] if folder.startswith('.') else folder}\n{_paragraph(words, '    ')}"
    if any(name.startswith("tracks/") for name in names):
        yield "PRACTISING WITH THE TRACKS"
        yield from map(_paragraph, _practising(takes))
    if tuned.score.left_out:
        yield "WHAT WAS LEFT OUT"
        yield _paragraph(
            f"Not played: {', '.join(tuned.score.left_out)}. It doubles the voices for rehearsal; "
            "name it with --accompaniment to hear it."
        )
    yield "READING THE CENTS"
    yield _paragraph(READING_CENTS)
    yield "YOUR EARS"
    yield _paragraph(LISTENING)
    yield "YOUR VOICE"
    yield _paragraph(VOICE)


def how_to_use(takes: Sequence[Take], files: Sequence[Output]) -> OutputFile:
    """The text for a folder that holds these files."""
    text = "\n\n".join(_sections(takes, [file.name for file in files])) + "\n"
    return OutputFile(NAME, text.encode("utf-8"))
