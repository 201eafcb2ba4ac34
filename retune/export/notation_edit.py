"""Cents, chord names and comma accidentals written into the user's own MusicXML.

Nothing of the file is changed but by addition. A label is a direction in small print before its
note, in the note's voice: notation programs show it as staff text, select all of them at once,
and keep it apart from the words that are sung. Programs find the exact pitch in the note's own
`play` element.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from retune.adapters.engraving_markup import as_node
from retune.adapters.xml import Element
from retune.adapters.xml_editing import EditedDocument, as_element, text
from retune.export.notation_heads import Cents, Played, label_text, played_heads
from retune.export.notation_marks import (
    ADDED_SIGN,
    CHORD,
    COMMA_SIGNS,
    FIELD,
    LABEL,
    PLAY,
    SEPTIMAL,
    cents_type,
    has_comma_signs,
    identity,
    is_added_sign,
)
from retune.export.notation_signs import arrow_glyph, commas_of, septimal_glyph
from retune.harmony.symbols import doubtable_symbol, printed
from retune.page.annotate import first_of_chord, written_lengths
from retune.page.engrave_chords import appearances
from retune.page.engrave_moments import BarPlaces, places_of
from retune.pitch import PitchClass
from retune.score.model import Part
from retune.score.musicxml.layout import read_layout
from retune.score.musicxml.log import Log
from retune.score.musicxml.values import whole
from retune.tuning.model import TunedScore
from retune.tuning.policy import Temperament

_LABEL_LOOK = {"font_size": "7", "font_style": "normal"}
_CHORD_LOOK = {"font_size": "9", "font_style": "normal", "font_weight": "bold"}
"""Print of labels and chord names, sizes in points."""

_PLAIN_SIGNS = {-2: "flat-flat", -1: "flat", 0: "natural", 1: "sharp", 2: "double-sharp"}
_AFTER_ACCIDENTAL = (
    "time-modification", "stem", "notehead", "notehead-text", "staff", "beam", "notations",
    "lyric", "play", "listen",
)  # fmt: skip
_AFTER_NOTATIONS = ("lyric", "play", "listen")
_BEFORE_IDENTIFICATION = ("work", "movement-number", "movement-title")


@dataclass(frozen=True, slots=True)
class Additions:
    """What is to be added.

    `least` is how many cents a label must say at least somewhere; `play` is the exact pitch for
    programs.
    """

    cents: Cents = Cents.ROOT
    least: int = 0
    chords: bool = False
    accidentals: bool = False
    play: bool = True


@dataclass(frozen=True, slots=True)
class Edited:
    """A score with its additions, and what to tell of them: labels written, and doubts."""

    data: bytes
    labels: int
    doubts: tuple[str, ...]


def with_additions(
    tuned: TunedScore,
    document: EditedDocument,
    named: Mapping[str, Element],
    wish: Additions,
    alone: Part | None = None,
) -> Edited:
    """The document with what is wished written in.

    Parameters
    ----------
    named : mapping
        Note elements of the document by `Note.sources`.
    alone : Part, optional
        The only part in the document.
    """
    return _Writer(tuned, document, named, wish, alone).written()


class _Writer:
    def __init__(
        self,
        tuned: TunedScore,
        document: EditedDocument,
        named: Mapping[str, Element],
        wish: Additions,
        alone: Part | None,
    ) -> None:
        self._tuned = tuned
        self._document = document
        self._named = named
        self._wish = wish
        self._alone = alone
        self._layout = {one.heading.id: one for one in read_layout(document.root, Log())}
        self._numbers: Counter[str] = Counter()
        self._doubts: list[str] = []

    def written(self) -> Edited:
        bars = [[as_node(b.body) for b in part.bars] for part in self._layout.values()]
        found = written_lengths(bars)
        lengths = {source: found.get(id(note), Fraction(0)) for source, note in self._named.items()}
        heads = {
            source: passes
            for source, passes in played_heads(
                self._tuned,
                lengths,
                self._wish.cents,
                None if self._alone is None else self._alone.index,
            ).items()
            if source in self._named
        }
        # The nearer to its note, the earlier a direction stands.
        self._write_labels(heads)
        if self._wish.chords:
            self._write_chords()
        if self._wish.accidentals:
            self._write_signs(heads)
        if self._wish.play:
            for source, passes in heads.items():
                self._write_play(self._named[source], passes)
        self._write_field()
        return Edited(self._document.result(), self._numbers[LABEL], tuple(self._doubts))

    def _new(self, kind: str) -> str:
        self._numbers[kind] += 1
        return identity(kind, self._numbers[kind])

    # --- labels ---

    def _write_labels(self, heads: Mapping[str, Sequence[Played]]) -> None:
        """Directions before the first note of each stem, nearest to the staff first."""
        above = self._above()
        stems: dict[int, tuple[Element, list[tuple[bool, int, str]]]] = {}
        for source, passes in heads.items():
            said = label_text(passes, self._wish.least)
            part = passes[0].part
            if said and self._named[source].get("print-object") != "no":
                first = as_element(first_of_chord(as_node(self._named[source])))
                _, rows = stems.setdefault(id(first), (first, []))
                rows.append((above[part], part, said))
        for first, rows in stems.values():
            # The lower parts of a staff's upper half are the nearer ones to it.
            rows.sort(key=lambda row: (not row[0], -row[1] if row[0] else row[1]))
            for up, _, said in rows:
                self._document.add_before(first, self._words(first, LABEL, said, up=up))

    def _above(self) -> list[bool]:
        """By part: whether its labels stand above the staff, as do the upper ones of several."""
        staves: dict[tuple[str, int], list[int]] = {}
        for part in self._tuned.score.parts:
            staves.setdefault((part.source, part.staff), []).append(part.index)
        found = [True] * len(self._tuned.score.parts)
        if self._alone is None:
            for mates in staves.values():
                for index in mates[(len(mates) + 1) // 2 :]:
                    found[index] = False
        return found

    def _words(
        self, note: Element, kind: str, said: str, *, up: bool = True, offset: str = ""
    ) -> str:
        """A direction for where a note stands."""
        element = self._document.element
        look = _LABEL_LOOK if kind == LABEL else _CHORD_LOOK
        content = element("direction-type", element("words", text(said), **look))
        if offset:
            content += element("offset", offset)
        for tag in ("voice", "staff"):
            value = note.findtext(tag)
            if value and value.strip():
                content += element(tag, text(value.strip()))
        side = "above" if up else "below"
        return element("direction", content, placement=side, id=self._new(kind))

    # --- chords ---

    def _write_chords(self) -> None:
        """The chord names of each bar's first pass, over the highest part that is tuned."""
        tuned = self._tuned
        if self._document.root.find(".//harmony") is not None:
            self._doubts.append("it has chord symbols of its own; chord names are not added")
            return
        part = self._alone or next((p for p in tuned.score.parts if p.tuned), None)
        source = None if part is None else self._layout.get(part.source)
        if source is None or part is None:
            return
        staff = part.staff if self._alone is None else 1
        bars: dict[int, BarPlaces] = dict(enumerate(places_of(source, staff)))
        firsts = {bar.written: bar.onset for bar in reversed(tuned.score.bars)}
        back = tuned.score.transposition.fifths
        last = ""
        for one in appearances(tuned):
            chord = tuned.harmony.chords[one.chord]
            if chord.root is not None and back:
                chord = replace(chord, root=PitchClass.from_fifths(chord.root.fifths - back))
            said = printed(doubtable_symbol(chord))
            place = bars[one.bar].at(one.onset - firsts[one.bar]) if one.bar in bars else None
            if place is not None and said != last:
                note, offset = place
                self._document.add_before(note, self._words(note, CHORD, said, offset=offset))
            last = said

    # --- exact pitch ---

    def _write_play(self, note: Element, passes: Sequence[Played]) -> None:
        own = "".join(self._played(passes))
        if not own:
            return
        there = note.find("play")
        if there is not None:
            self._document.add_inside(there, own)
            return
        self._put(note, self._document.element("play", own, id=self._new(PLAY)), ("listen",))

    def _played(self, passes: Sequence[Played]) -> Iterator[str]:
        for number, played in enumerate(passes, 1):
            if number == 1 or played.values != passes[0].values:
                for after, value in played.values:
                    kind = cents_type(number, after)
                    yield self._document.element("other-play", f"{value:.6f}", type=kind)

    def _put(self, note: Element, markup: str, followers: Sequence[str]) -> None:
        """Put a child at the place in a note that the schema gives it."""
        follower = next((child for child in note if child.tag in followers), None)
        if follower is None:
            self._document.add_inside(note, markup)
        else:
            self._document.add_before(follower, markup)

    # --- comma accidentals ---

    def _write_signs(self, heads: Mapping[str, Sequence[Played]]) -> None:
        if has_comma_signs(self._document.root):
            self._doubts.append("it has comma accidentals of its own; none are added")
            return
        missing = 0
        for source, passes in heads.items():
            ratio = passes[0].ratio
            if ratio is not None and not self._write_sign(self._named[source], ratio):
                missing += 1
        if missing:
            self._doubts.append(f"{missing} notes are off by commas that have no sign")

    def _write_sign(self, note: Element, ratio: Fraction) -> bool:
        commas = commas_of(ratio)
        alter = whole(note.findtext("pitch/alter") or "0", -2, 2)
        if commas is None or alter is None:
            return False
        arrow, septimal = arrow_glyph(alter, commas.syntonic), septimal_glyph(commas.septimal)
        if bool(commas.syntonic) != bool(arrow) or bool(commas.septimal) != bool(septimal):
            return False
        there = note.find("accidental")
        if arrow and there is None:
            # Programs that do not know the glyph show the plain sign, which is never wrong.
            sign = self._document.element(
                "accidental", _PLAIN_SIGNS[alter], **ADDED_SIGN, smufl=arrow
            )
            self._put(note, sign, _AFTER_ACCIDENTAL)
        elif arrow and there is not None:
            if there.get("smufl") is not None or is_added_sign(there):
                return False
            self._document.add_attribute(there, "smufl", arrow)
        if septimal:
            element = self._document.element
            mark = element("accidental-mark", "other", placement="above", smufl=septimal)
            own = element("notations", mark, id=self._new(SEPTIMAL))
            self._put(note, own, _AFTER_NOTATIONS)
        return True

    # --- the field ---

    def _write_field(self) -> None:
        """Say in the file what the additions are, for readers and for a later run."""
        document, root = self._document, self._document.root
        field = document.element(
            "miscellaneous-field", text("; ".join(self._explained())), name=FIELD
        )
        there = root.find("identification/miscellaneous")
        if there is not None:
            document.add_inside(there, field)
            return
        box = document.element("miscellaneous", field)
        identification = root.find("identification")
        if identification is not None:
            document.add_inside(identification, box)
            return
        box = document.element("identification", box)
        follower = next((c for c in root if c.tag not in _BEFORE_IDENTIFICATION), None)
        if follower is not None:
            document.add_before(follower, box)

    def _explained(self) -> Iterator[str]:
        policy = self._tuned.policy
        if self._numbers[LABEL]:
            against = (
                "the root of the chord" if self._wish.cents is Cents.ROOT else "equal temperament"
            )
            yield f"small numbers at notes are cents from {against}, against a piano's steps"
        if self._numbers[PLAY]:
            yield f"other-play: cents from equal temperament at A4 = {policy.reference_hz:g} Hz"
        if self._wish.accidentals and not has_comma_signs(self._document.root):
            yield f"{COMMA_SIGNS} count from the root of the chord"
        if policy.temperament is Temperament.JUST:
            yield f"just, {policy.prime_limit}-limit, drift {policy.drift}"
        else:
            yield f"{policy.temperament} temperament"
