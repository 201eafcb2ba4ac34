"""Our reader against music21: every MusicXML file that music21 ships, read by both.

Compared are onset in the bar, sounding key and duration of every note but grace notes, bar by
bar and part by part. Every difference is listed below with its reason, and each reason is
checked on the notes themselves, so that a new difference in a listed file is found too.
"""

from __future__ import annotations

import warnings
from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path

import pytest
from music21 import __file__ as music21_file
from music21 import chord, converter, harmony, note, stream

from retune.adapters.xml import read_document
from retune.errors import UnreadableError
from retune.limits import Limits
from retune.score.musicxml import noteheads, read_musicxml
from retune.written import WrittenPart, WrittenScore

ROOT = Path(music21_file).parent
SUITE = "musicxml/lilypondTestSuite"

Sounding = tuple[Fraction, int, Fraction]
"""Onset in the bar, key, duration."""
Bars = list[Counter[Sounding]]


def musicxml_files() -> list[str]:
    return sorted(
        path.relative_to(ROOT).as_posix()
        for suffix in ("xml", "musicxml", "mxl")
        for path in ROOT.rglob(f"*.{suffix}")
    )


# --- the two readings ---------------------------------------------------------------------


def our_bars(score: WrittenScore) -> list[Bars]:
    return [
        [
            Counter((n.onset, n.pitch.key, n.duration) for n in bar.notes if not n.grace)
            for bar in part.bars
        ]
        for part in score.parts
    ]


def their_bars(path: Path) -> list[Bars]:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        score = converter.parse(path, format="musicxml", forceSource=True, storePickle=False)
        score = score.toSoundingPitch(inPlace=False)
    parts: dict[object, Bars] = {}
    for index, part in enumerate(score.parts):
        bars = [_sounding(bar) for bar in part.getElementsByClass(stream.Measure)]
        # music21 makes a part of each staff; we keep the part of the file.
        of_staff = isinstance(part, stream.PartStaff) and "-Staff" in str(part.id)
        name = str(part.id).split("-Staff")[0] if of_staff else index
        known = parts.get(name)
        parts[name] = bars if known is None else [a + b for a, b in zip(known, bars, strict=True)]
    return list(parts.values())


def _sounding(bar: stream.Measure) -> Counter[Sounding]:
    found: Counter[Sounding] = Counter()
    for element in bar.recurse().notes:
        if isinstance(element, harmony.Harmony) or element.duration.isGrace:
            continue
        if not isinstance(element, note.Note | chord.Chord):
            continue
        onset = _exact(element.getOffsetInHierarchy(bar))
        for pitch in element.pitches:
            found[onset, round(pitch.ps), _exact(element.quarterLength)] += 1
    return found


def _exact(value: float | Fraction) -> Fraction:
    """music21 keeps floats where they are exact binary fractions, or nearly what was meant."""
    return Fraction(value).limit_denominator(100_000)


# --- reasons for differences --------------------------------------------------------------


@dataclass(frozen=True)
class Reading:
    """All that a reason may look at."""

    ours: list[Bars]
    theirs: list[Bars]
    score: WrittenScore
    data: bytes


def _lowered_once(reading: Reading) -> bool:
    """Clef and transposition name one octave twice; we count it once and say so."""
    named = {f.where.part for f in reading.score.findings if "lowered once" in f.what}
    parts = tuple(_moved(part, -1) if part.name in named else part for part in reading.score.parts)
    return our_bars(replace(reading.score, parts=parts)) == reading.theirs


def _moved(part: WrittenPart, octaves: int) -> WrittenPart:
    bars = []
    for bar in part.bars:
        notes = tuple(
            replace(n, pitch=replace(n.pitch, octave=n.pitch.octave + octaves)) for n in bar.notes
        )
        bars.append(replace(bar, notes=notes))
    return replace(part, bars=tuple(bars))


def _hidden_twins(reading: Reading) -> bool:
    """Notes that are not printed play out an ornament of a printed note; we leave them out."""
    hidden = sum(
        element.get("print-object") == "no" and element.find("pitch") is not None
        for _, element in noteheads(read_document(reading.data, Limits()).root)
    )
    extra = 0
    for ours, theirs in _pairs(reading):
        if ours - theirs:
            return False
        extra += (theirs - ours).total()
    return 0 < extra <= hidden


def _chord_length(reading: Reading) -> bool:
    """A note of a chord is shorter than the others; music21 gives all of a chord one length."""
    return all(_without(ours, 2) == _without(theirs, 2) for ours, theirs in _pairs(reading))


def _without(bar: Counter[Sounding], field: int) -> Counter[tuple[Fraction | int, ...]]:
    stripped: Counter[tuple[Fraction | int, ...]] = Counter()
    for sounding, count in bar.items():
        stripped[sounding[:field] + sounding[field + 1 :]] += count
    return stripped


def _between_keys(reading: Reading) -> bool:
    """Quarter tones: we round toward the natural note, the comparison to the even key."""
    return _within_a_semitone(reading) and any(
        "nearest key" in finding.what for finding in reading.score.findings
    )


def _accidental_without_alter(reading: Reading) -> bool:
    """A printed accidental and no <alter>: MusicXML sounds <alter>, music21 the accidental."""
    return _within_a_semitone(reading) and any(
        "printed accidental" in finding.what for finding in reading.score.findings
    )


def _within_a_semitone(reading: Reading) -> bool:
    for ours, theirs in _pairs(reading):
        if _without(ours, 1) != _without(theirs, 1):
            return False
        one, other = (sorted(bar.elements()) for bar in (ours - theirs, theirs - ours))
        if any(abs(a[1] - b[1]) > 1 for a, b in zip(one, other, strict=True)):
            return False
    return True


def _percussion_clef(reading: Reading) -> bool:
    """A pitch on a percussion clef: it does not sound here, and is counted."""
    return sum(part.unpitched for part in reading.score.parts) == sum(
        (theirs - ours).total() for ours, theirs in _pairs(reading)
    )


def _direction_in_chord(reading: Reading) -> bool:
    """music21 moves on inside a chord when a direction stands between its notes (21f).

    The file itself says so: its later notes bear <chord/>, so all start with the first.
    """
    chords = [
        element.find("chord") is not None
        for _, element in noteheads(read_document(reading.data, Limits()).root)
    ]
    onsets = [n.onset for n in reading.score.parts[0].bars[0].notes]
    return chords[:3] == [False, True, True] and onsets[:3] == [0, 0, 0]


def _staff_not_named(reading: Reading) -> bool:
    """A note of a two-staff part names no staff; music21 puts it on both (02e)."""
    return all(not ours - theirs and set(theirs) == set(ours) for ours, theirs in _pairs(reading))


def _pairs(reading: Reading) -> list[tuple[Counter[Sounding], Counter[Sounding]]]:
    return [
        (ours, theirs)
        for our_part, their_part in zip(reading.ours, reading.theirs, strict=True)
        for ours, theirs in zip(our_part, their_part, strict=True)
    ]


EXPLAINED: dict[str, Callable[[Reading], bool]] = {
    "corpus/beethoven/opus59no2/movement1.mxl": _hidden_twins,
    "corpus/beethoven/opus59no2/movement2.mxl": _hidden_twins,
    "corpus/haydn/opus1no1/movement3.mxl": _hidden_twins,
    "corpus/haydn/opus1no1/movement4.mxl": _hidden_twins,
    "corpus/haydn/opus1no1/movement5.mxl": _hidden_twins,
    "corpus/schumann_robert/dichterliebe_no2.xml": _hidden_twins,
    "corpus/schumann_robert/opus41no1/movement1.mxl": _hidden_twins,
    "corpus/schumann_robert/opus41no1/movement5.mxl": _hidden_twins,
    "corpus/schumann_robert/opus48no2.mxl": _hidden_twins,
    "corpus/schubert/Lindenbaum.xml": _chord_length,
    "corpus/trecento/PMFC_01-Lugentium siccentur.xml": _lowered_once,
    "corpus/trecento/PMFC_01-Rex quem metrorum.xml": _lowered_once,
    "corpus/trecento/PMFC_01-Virtutibus laudabilis.xml": _lowered_once,
    "corpus/trecento/PMFC_04-A lle s_andra lo spirt.xml": _lowered_once,
    "corpus/trecento/PMFC_04-Cara mi donna.xml": _lowered_once,
    "corpus/trecento/PMFC_04-Quanto piu caro.xml": _lowered_once,
    "corpus/trecento/PMFC_06_10-I senti gia come l_arco.xml": _lowered_once,
    "corpus/trecento/PMFC_06_8-In Verde Prato.xml": _lowered_once,
    "corpus/trecento/PMFC_13_04-Credo Cursor.xml": _accidental_without_alter,
    "corpus/trecento/PMFC_23_15a-Kyrie Humano Generi a.xml": _lowered_once,
    "corpus/trecento/PMFC_23_15b-Kyrie Humano Generi b.xml": _lowered_once,
    "corpus/trecento/PMFC_23_16-Kyrie Apt 16.xml": _lowered_once,
    "corpus/trecento/PMFC_23_17-Kyrie Principum Effectivum.xml": _lowered_once,
    "corpus/trecento/PMFC_23_19-Kyrie Perrinet.xml": _lowered_once,
    "corpus/trecento/PMFC_23_20-Kyrie O Sacra Virgo Beata.xml": _lowered_once,
    "corpus/trecento/PMFC_23_21-Kyrie Guymont.xml": _lowered_once,
    "corpus/trecento/PMFC_23_22-Kyrie Summe Clementissime.xml": _lowered_once,
    "corpus/trecento/PMFC_23_23-Kyrie Rex Inmense Maiestasis.xml": _lowered_once,
    "corpus/trecento/PMFC_23_24-Kyrie Ave Desiderii.xml": _lowered_once,
    f"{SUITE}/01d-Pitches-Microtones.xml": _between_keys,
    f"{SUITE}/01f-Pitches-EditorialMicrotoneAccidentals.xml": _between_keys,
    f"{SUITE}/02e-Rests-NoType.xml": _staff_not_named,
    f"{SUITE}/12ab-Clefs-Percussion-NonTrad.xml": _percussion_clef,
    f"{SUITE}/21f-Chord-ElementInBetween.xml": _direction_in_chord,
    f"{SUITE}/32c-MultipleNotationChildren.xml": _accidental_without_alter,
}

# Only rests, percussion or fret numbers: refused by us, as there is nothing to tune.
NO_PITCHES = (
    "corpus/demos/drum_sample.xml",
    "musicxml/testTab.xml",
    *(
        f"{SUITE}/{name}.xml"
        for name in (
            "02a-Rests-Durations",
            "02b-Rests-PitchedRests",
            "02c-Rests-MultiMeasureRests",
            "41b-MultiParts-MoreThan10",
            "41f-StaffGroups-Overlapping",
            "41g-PartNoId",
            "41h-TooManyParts",
            "45a-SimpleRepeat",
            "45c-RepeatMultipleTimes",
            "45d-Repeats-Nested-Alternatives",
            "45e-Repeats-Nested-Alternatives",
            "45f-Repeats-InvalidEndings",
            "46a-Barlines",
            "51b-Header-Quotes",
            "51c-MultipleRights",
            "51d-EmptyTitle",
            "52a-PageLayout",
        )
    ),
)

# A varied sample: chorales, madrigals, motets, quartets, lieder, transposing parts, tuplets.
SAMPLE = (
    "corpus/bach/bwv66.6.mxl",
    "corpus/bach/bwv227.3.mxl",
    "corpus/bach/bwv41.6.mxl",
    "corpus/bach/bwv4.8.mxl",
    "corpus/ciconia/quod_jactatur.xml",
    "corpus/corelli/opus3no1/1grave.xml",
    "corpus/johnson_j_r/lift_every_voice.mxl",
    "corpus/liliuokalani/aloha_oe.mxl",
    "corpus/luca/gloria.xml",
    "corpus/lusitano/allor_che_ignuda.mxl",
    "corpus/monteverdi/madrigal.3.7.mxl",
    "corpus/schubert/Lindenbaum.xml",
    "corpus/schumann_robert/opus48no2.mxl",
    "corpus/trecento/PMFC_23_16-Kyrie Apt 16.xml",
    "corpus/demos/voices_with_chords.xml",
    f"{SUITE}/01a-Pitches-Pitches.xml",
    f"{SUITE}/01f-Pitches-EditorialMicrotoneAccidentals.xml",
    f"{SUITE}/03b-Rhythm-Backup.xml",
    f"{SUITE}/21f-Chord-ElementInBetween.xml",
    f"{SUITE}/23d-Tuplets-Nested.xml",
    f"{SUITE}/24e-GraceNote-StaffChange.xml",
    f"{SUITE}/42b-MultiVoice-MidMeasureClefChange.xml",
    f"{SUITE}/43d-MultiStaff-StaffChange.xml",
    f"{SUITE}/72b-TransposingInstruments-Full.xml",
    f"{SUITE}/72c-TransposingInstruments-Change.xml",
    f"{SUITE}/90a-Compressed-MusicXML.mxl",
)


def check(name: str) -> None:
    path = ROOT / name
    data = path.read_bytes()
    if name in NO_PITCHES:
        with pytest.raises(UnreadableError, match="no notes that sound"):
            read_musicxml(data, Limits())
        return
    score = read_musicxml(data, Limits())
    ours, theirs = our_bars(score), their_bars(path)
    if name in EXPLAINED:
        assert ours != theirs, "listed as different, but both readings agree"
        assert EXPLAINED[name](Reading(ours, theirs, score, data))
    else:
        assert ours == theirs


@pytest.mark.parametrize("name", SAMPLE)
def test_a_sample_agrees_with_music21(name: str) -> None:
    check(name)


@pytest.mark.slow
@pytest.mark.parametrize("name", musicxml_files())
def test_every_file_agrees_with_music21(name: str) -> None:
    check(name)
