"""One part of a score by itself: what others sing on its staff, and their staves, taken out."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping

from retune.adapters.engraving_markup import Node, node
from retune.tuning.model import TunedScore

Bars = list[tuple[Node, Node]]
"""The bars of one part: the frame, which bears the number, and the body, which holds the music."""


def keep_only(
    tuned: TunedScore, part: int, music: Mapping[str, Bars], named: Mapping[str, Node]
) -> None:
    """Take all music out of the part's document part that it does not sing."""
    wanted = tuned.score.parts[part]
    notes = [one.note for one in tuned.notes if one.note.part == part]
    own = {id(named[s]) for note in notes for s in note.sources if s in named}
    words = {note.sources[0]: note.lyric for note in reversed(notes) if note.sources}
    for source, word in words.items():
        if word and source in named:
            _give_word(named[source], word)
    staff = str(wanted.staff)
    played = {bar.written for bar in tuned.score.bars}
    for index, (_, body) in enumerate(music.get(wanted.source, [])):
        if index not in played:
            own |= set(_by_voice(body, staff, wanted.voice))
        voices = {_text(e, "voice") for e in body.iterchildren("note") if id(e) in own}
        voices = voices or {_first_voice(body, staff)}
        for child in list(body):
            _settle(child, body, staff, voices, own)
        _join_chords(body)


def _by_voice(body: Node, staff: str, voice: str) -> Iterator[int]:
    """Note elements of a bar that is not played, as outside an excerpt: those of the part's voice.

    All of the staff stays where that voice has none.
    """
    notes = [e for e in body.iterchildren("note") if _text(e, "staff") == staff]
    own = [e for e in notes if _text(e, "voice") == voice and e.find("rest") is None]
    yield from map(id, own or notes)


def _settle(child: Node, body: Node, staff: str, voices: set[str], own: set[int]) -> None:
    """Keep, empty or take out one element of a bar."""
    tag = child.tag
    if tag == "note":
        rest = child.find("rest") is not None
        mine = (
            _text(child, "staff") == staff and _text(child, "voice") in voices
            if rest
            else id(child) in own
        )
        if not mine:
            _make_silent(child, body)
        else:
            _drop(child, "staff")
            for lyric in child.findall("lyric"):
                # Hidden where it repeats the words of the voice that is gone now.
                lyric.attrib.pop("print-object", "")
    elif tag in ("direction", "harmony"):
        if _text(child, "staff") == staff:
            _drop(child, "staff")
        else:
            body.remove(child)
    elif tag == "attributes":
        _one_staff(child, staff)


def _make_silent(note: Node, body: Node) -> None:
    """Put a step forward in a note's place; chord and grace notes have no time of their own."""
    duration = note.find("duration")
    if note.find("chord") is None and note.find("grace") is None and duration is not None:
        forward = node("forward")
        forward.append(node("duration", duration.text))
        body.replace(note, forward)
        follower = forward.getnext()
        if follower is not None and follower.find("chord") is not None:
            # What is left of the chord takes the time instead.
            follower.set("heads-chord", "yes")
            for child in note.findall("lyric"):
                follower.append(child)
            for child in note.findall("beam"):
                _put_beam(follower, child)
    else:
        follower = note.getnext()
        led = follower is not None and follower.find("chord") is not None
        if led and follower is not None and note.get("heads-chord", ""):
            follower.set("heads-chord", "yes")
        body.remove(note)


def _put_beam(note: Node, beam: Node) -> None:
    """Give a note a beam at the place that the schema gives it."""
    for child in note:
        if child.tag in ("notations", "lyric", "play", "listen"):
            child.addprevious(beam)
            return
    note.append(beam)


def _join_chords(body: Node) -> None:
    """Where the first note of a chord went, the next one leads it and takes its time."""
    for note in body.findall("note"):
        if "heads-chord" in note.attrib:
            del note.attrib["heads-chord"]
            _drop(note, "chord")
            before = _before(note)
            if before is not None and before.tag == "forward":
                body.remove(before)


def _before(element: Node) -> Node | None:
    parent = element.getparent()
    found: Node | None = None
    for child in parent if parent is not None else ():
        if child is element:
            return found
        found = child
    return None


def _first_voice(body: Node, staff: str) -> str:
    """The voice of the first rest of a staff, for bars in which the part is silent."""
    for note in body.iterchildren("note"):
        if note.find("rest") is not None and _text(note, "staff") == staff:
            return _text(note, "voice")
    return "1"


def _one_staff(attributes: Node, staff: str) -> None:
    for child in list(attributes):
        number = child.get("number", "")
        if child.tag == "staves" or (number and number != staff):
            attributes.remove(child)
        elif number:
            del child.attrib["number"]


def _text(element: Node, tag: str) -> str:
    return (element.findtext(tag) or "1").strip()


def _drop(element: Node, tag: str) -> None:
    for child in element.findall(tag):
        element.remove(child)


def _give_word(note: Node, word: str) -> None:
    """Put a syllable under a notehead that has none, as where one voice's text serves two."""
    if any(True for _ in _own_words(note)):
        return
    lyric = node("lyric", number="1")
    lyric.append(node("syllabic", "begin" if word.endswith("-") else "single"))
    lyric.append(node("text", word.rstrip("-")))
    note.append(lyric)


def _own_words(note: Node) -> Iterable[Node]:
    return (lyric for lyric in note.findall("lyric") if len(lyric.get("number", "1")) < 3)
