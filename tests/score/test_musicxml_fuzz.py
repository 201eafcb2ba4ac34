"""Whatever bytes come, the reader returns a sane score or raises a `RetuneError`."""

from __future__ import annotations

import re
from fractions import Fraction

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from retune.errors import RetuneError
from retune.limits import Limits
from retune.score.musicxml import read_musicxml
from retune.written import WrittenScore
from tests.score.musicxml_text import attributes, direction, note, part_text, rest, score_text

SETTINGS = settings(
    max_examples=150,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=[HealthCheck.too_slow],
)

_HEAD = attributes(
    "<key><fifths>-3</fifths><mode>minor</mode></key>"
    "<time><beats>3+2</beats><beat-type>8</beat-type></time><staves>2</staves>"
    '<clef number="1"><sign>G</sign><clef-octave-change>-1</clef-octave-change></clef>'
    "<transpose><diatonic>-1</diatonic><chromatic>-2</chromatic><double/></transpose>"
)
_DIRECTION = direction(
    "<metronome><beat-unit>quarter</beat-unit><per-minute>60-66</per-minute></metronome>",
    '<offset>1</offset><staff>1</staff><sound tempo="66" dynamics="80" dacapo="yes"/>',
)
_LYRIC = (
    '<lyric number="1" time-only="1,2"><syllabic>begin</syllabic><text>a</text><elision/>'
    "<syllabic>end</syllabic><text>b</text></lyric>"
)
_TUPLET = "<time-modification><actual-notes>3</actual-notes><normal-notes>2</normal-notes>"
_HARMONY = (
    "<harmony><root><root-step>B</root-step><root-alter>-1</root-alter></root>"
    "<kind>dominant</kind><bass><bass-step>D</bass-step></bass></harmony>"
)
_BARLINE = (
    '<barline location="right"><fermata/><ending number="1,2" type="stop"/>'
    '<repeat direction="backward" times="3"/></barline>'
)
# A little of everything the reader looks at.
RICH = score_text(
    part_text(
        _HEAD + _DIRECTION + _HARMONY + note("Bb4", 4, "<type>quarter</type>" + _LYRIC),
        note("F#4", 1, f"<type>eighth</type>{_TUPLET}</time-modification>", 'dynamics="90"')
        + note("D4", None, "<voice>1</voice>").replace("<pitch>", "<grace/><pitch>")
        + note("D4", 4, '<tie type="start"/><voice>2</voice><staff>2</staff>', 'id="a"')
        + "<backup><duration>4</duration></backup><forward><duration>2</duration></forward>"
        + rest(2)
        + note("C4", 2, "<accidental>natural</accidental>", 'print-object="no"')
        + _BARLINE,
    )
)

NUMBER = re.compile(rb"(?<=[>\"])[-+0-9.,]+(?=[<\"])")
WORD = re.compile(rb"(?<=[>\"])[A-Za-z]+(?=[<\"])")
NUMBERS = st.sampled_from(
    [
        b"0",
        b"-1",
        b"1e9",
        b"99999999999999999999999",
        b"0.000000000000000000001",
        b"1/0",
        b"",
        b"NaN",
        b"-0.5",
        b"7",
        b"1023",
        b"\xd9\xa1",
        b"4 4",
        b"1" * 4000,
    ]
)
WORDS = st.sampled_from([b"", b"x", b"C", b"quarter", b"yes", b"no", b"left", b"\xc3\xa9", b"D.C."])


def read_or_refuse(data: bytes) -> None:
    try:
        score = read_musicxml(data, Limits(max_bytes=1_000_000))
    except RetuneError as error:
        message = str(error)
    else:
        message = "\n".join(map(str, score.findings))
        assert_sane(score)
    assert "Traceback" not in message


def assert_sane(score: WrittenScore) -> None:
    sources: set[str] = set()
    for part in score.parts:
        for bar in part.bars:
            assert bar.length >= 0
            for written in bar.notes:
                assert isinstance(written.onset, Fraction)
                assert isinstance(written.duration, Fraction)
                assert 0 <= written.onset <= written.onset + written.duration <= bar.length
                assert 0 <= written.pitch.key <= 127
                assert written.source not in sources
                sources.add(written.source)
            assert all(mark.onset >= 0 for mark in bar.marks)
    assert sources


def test_the_rich_score_itself_is_read() -> None:
    assert_sane(read_musicxml(RICH, Limits()))


@SETTINGS
@given(st.integers(0, len(RICH)), st.integers(0, len(RICH)))
def test_bytes_cut_out(one: int, other: int) -> None:
    start, end = sorted((one, other))
    read_or_refuse(RICH[:start] + RICH[end:])


@SETTINGS
@given(st.lists(st.tuples(st.integers(0, len(RICH) - 1), st.integers(0, 255)), max_size=6))
def test_bytes_changed(changes: list[tuple[int, int]]) -> None:
    data = bytearray(RICH)
    for place, value in changes:
        data[place] = value
    read_or_refuse(bytes(data))


@SETTINGS
@given(st.data())
def test_numbers_and_words_changed(data: st.DataObject) -> None:
    text = RICH
    for pattern, values in ((NUMBER, NUMBERS), (WORD, WORDS)):
        places = list(pattern.finditer(text))
        chosen = data.draw(st.lists(st.sampled_from(places), max_size=5, unique=True))
        for match in sorted(chosen, key=lambda found: -found.start()):
            text = text[: match.start()] + data.draw(values) + text[match.end() :]
    read_or_refuse(text)


@SETTINGS
@given(st.data())
def test_elements_taken_out_doubled_or_emptied(data: st.DataObject) -> None:
    text = RICH.decode()
    elements = list(re.finditer(r"<([a-z-]+)[^>]*>(?:(?!<\1).)*?</\1>", text))
    match = data.draw(st.sampled_from(elements))
    whole = match.group()
    change = data.draw(
        st.sampled_from(["", whole * 2, f"<{match[1]}/>", f"<{match[1]}>?</{match[1]}>"])
    )
    read_or_refuse((text[: match.start()] + change + text[match.end() :]).encode())


@SETTINGS
@given(st.binary(max_size=200))
def test_any_bytes(data: bytes) -> None:
    for start in (b"", b"<?xml version='1.0'?>", b"PK\x03\x04", b"<score-partwise>"):
        read_or_refuse(start + data)


@pytest.mark.slow
@settings(SETTINGS, max_examples=5000, derandomize=False)
@given(st.data())
def test_numbers_and_words_changed_at_length(data: st.DataObject) -> None:
    test_numbers_and_words_changed.hypothesis.inner_test(data)


def test_a_file_of_endless_numbers_is_read_or_refused() -> None:
    bars = [
        attributes(f"<divisions>{10**20 + 2 * n + 1}</divisions>")
        + note("C4", 4).replace("<duration>4", f"<duration>{3 * 10**18 + n}.{n}")
        for n in range(3000)
    ]
    read_or_refuse(score_text(part_text("".join(bars))))
