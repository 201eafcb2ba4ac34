"""From a choices file to the score, the policy and the decisions that it asks for."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.choices import (
    CentreChoice,
    Choices,
    ChordChoice,
    PassageChoice,
    PedalChoice,
    RatioChoice,
)
from retune.choicesfile.model import ChoicesFile
from retune.choicesfile.partnames import PartNames
from retune.choicesfile.places import Spot, Survey, fit_findings, onsets, spans, survey
from retune.errors import Finding
from retune.pitch import PitchClass
from retune.score.arranged import Breath, with_breaths, with_parts, with_words
from retune.score.model import Score, SingerNote
from retune.score.options import Hold, ReadOptions, TempoAt
from retune.score.transpose import moved, transposed
from retune.tuning.policy import Policy


@dataclass(frozen=True)
class Directed:
    """What a choices file makes of a score.

    Parameters
    ----------
    score : Score
        With its parts, tempo and words as the director has them, transposed on wish.
    policy : Policy
    choices : Choices
    ratio_lines : tuple of int
        Lines of the file on which the choices' ratios stand.
    survey : Survey
        Where every decision stands now.
    names : PartNames
    findings : tuple of Finding
    """

    score: Score
    policy: Policy
    choices: Choices
    ratio_lines: tuple[int, ...]
    survey: Survey
    names: PartNames
    findings: tuple[Finding, ...]


def directed(
    read: Callable[[ReadOptions], Score],
    reading: ReadOptions,
    policy: Policy,
    file: ChoicesFile,
) -> Directed:
    """Read a score as its choices ask.

    Parameters
    ----------
    read : callable
        Reads the score with the given options; called a second time where the choices bear on
        what sounds or how fast.
    reading, policy
        As the command line has them; its wishes stand before those of the file.
    """
    plain = read(replace(reading, transpose=0))
    found = survey(plain, file)
    names = PartNames(plain, file)
    options = _options(plain, reading, found, names)
    score = plain
    if options != replace(reading, transpose=0):
        score = read(options)
    parts = PartNames(score, file)
    parts.missing |= names.missing
    score = transposed(_with_parts(score, parts, file), reading.transpose)
    maker = _Maker(score, found, parts)
    choices, lines = maker.choices()
    score = with_breaths(score, list(maker.breaths()))
    score = with_words(score, file.piece.get("title"), list(maker.told()))
    policy = _policy(policy, score, found, parts)
    findings = (*fit_findings(plain, found), *parts.findings())
    return Directed(
        replace(score, findings=(*score.findings, *findings)),
        policy,
        choices,
        lines,
        found,
        parts,
        findings,
    )


def _options(plain: Score, reading: ReadOptions, found: Survey, names: PartNames) -> ReadOptions:
    """How the score is read, with what the choices ask of reading."""
    file, section = found.file, found.file.section("parts")

    def named(key: str) -> tuple[str, ...]:
        line = file.lines.get(("parts", key), 0)
        known = []
        for wish in section.get(key, ()):
            name = names.name(wish)
            if name is None:
                names.missing[wish, line] = None
            else:
                known.append(name)
        return tuple(known)

    tempi = tuple(
        TempoAt(s.first.written, s.first.inside, Fraction(str(s.entry.values["beats"])))
        for s in found.of("tempo")
        if s.first is not None
    )
    holds = tuple(
        Hold(s.first.written, s.first.inside, Fraction(str(s.entry.values["hold"])))
        for s in found.of("fermata")
        if s.first is not None
    )
    return replace(
        reading,
        transpose=0,
        accompaniment=tuple(dict.fromkeys((*reading.accompaniment, *named("accompaniment")))),
        voices=named("voices"),
        doubled=named("doubled"),
        tempi=tempi,
        holds=holds,
    )


def _with_parts(score: Score, names: PartNames, file: ChoicesFile) -> Score:
    """The score with its parts named and ordered as the file has them."""
    section = file.section("parts")
    new: dict[int, str] = {}
    for old, name in section.get("names", {}).items():
        index = names.index(old, file.lines.get(("parts", "names"), 0))
        if index is not None:
            new[index] = name
    line = file.lines.get(("parts", "order"), 0)
    order = [names.index(wish, line) for wish in section.get("order", ())]
    arranged, names.placed = with_parts(score, new, [i for i in order if i is not None])
    return arranged


def _policy(policy: Policy, score: Score, found: Survey, names: PartNames) -> Policy:
    """The policy, with the tonic and the melody of the file where the command line has none."""
    file = found.file
    tonic = file.section("tuning").get("tonic")
    if policy.tonic is None and tonic is not None:
        policy = replace(policy, tonic=moved(tonic, found.moved))
    wish = policy.melody or file.section("parts").get("melody")
    if wish is None:
        return policy
    if policy.melody is not None and names.name(wish) is None:
        return policy
    index = names.index(wish, file.lines.get(("parts", "melody"), 0))
    return replace(policy, melody=None if index is None else score.parts[index].name)


@dataclass
class _Maker:
    """Turns the decisions that have a place into values of the score as played."""

    score: Score
    found: Survey
    names: PartNames

    def _pitch(self, pitch: PitchClass | None) -> PitchClass | None:
        """A pitch of the file as the score has it now."""
        if pitch is None:
            return None
        return moved(moved(pitch, self.found.moved), self.score.transposition)

    def choices(self) -> tuple[Choices, tuple[int, ...]]:
        """All decisions on analysis and tuning, and the lines of the ratios."""
        ratios = list(self._ratios())
        return (
            Choices(
                chords=tuple(self._chords()),
                ratios=tuple(one for one, _ in ratios),
                passages=tuple(self._passages()),
                pedals=tuple(self._pedals()),
                centres=tuple(self._centres()),
            ),
            tuple(line for _, line in ratios),
        )

    def _chords(self) -> Iterator[ChordChoice]:
        for spot in self.found.of("chord"):
            entry = spot.entry
            for onset in onsets(self.score, spot):
                end = None
                if (beats := entry.get("beats")) is not None:
                    end = onset + Fraction(str(beats)) * self.score.bar_at(onset).beat_length
                root = self._pitch(entry.get("root"))
                yield ChordChoice(onset, end, root, entry.get("quality"), entry.get("limit"))

    def _ratios(self) -> Iterator[tuple[RatioChoice, int]]:
        for spot in self.found.of("ratio"):
            values, line = spot.entry.values, spot.entry.line
            part = self.names.index(values["part"], line)
            for onset in onsets(self.score, spot) if part is not None else ():
                yield RatioChoice(onset, part or 0, values["ratio"]), line

    def _passages(self) -> Iterator[PassageChoice]:
        for spot in self.found.of("passage"):
            entry = spot.entry
            melody = entry.get("melody")
            part = None if melody is None else self.names.index(melody, entry.line)
            for span in spans(self.score, spot):
                yield PassageChoice(
                    span,
                    entry.get("prime_limit"),
                    entry.get("drift"),
                    entry.get("held_shift"),
                    part,
                )

    def _pedals(self) -> Iterator[PedalChoice]:
        for spot in self.found.of("pedal"):
            pitch = self._pitch(spot.entry.values["pitch"])
            for span in spans(self.score, spot):
                if pitch is not None:
                    yield PedalChoice(span, pitch, spot.entry.get("cents"))

    def _centres(self) -> Iterator[CentreChoice]:
        for spot in self.found.of("centre"):
            entry = spot.entry
            for onset in onsets(self.score, spot):
                yield CentreChoice(
                    onset, entry.get("cents") or 0.0, self._pitch(entry.get("tonic"))
                )

    def breaths(self) -> Iterator[Breath]:
        """Breaths, every time they come."""
        for spot in self.found.of("breath"):
            parts = self._for(spot)
            for onset in onsets(self.score, spot):
                yield Breath(onset, parts)

    def told(self) -> Iterator[SingerNote]:
        """Notes to singers, every time their bars come."""
        for spot in self.found.of("note_to_singers"):
            parts = self._for(spot)
            for span in spans(self.score, spot) if parts else ():
                yield SingerNote(span.onset, span.end, parts, spot.entry.values["text"])

    def _for(self, spot: Spot) -> tuple[int, ...]:
        wishes: Sequence[str] | None = spot.entry.get("parts")
        return self.names.indices(wishes, spot.entry.line)
