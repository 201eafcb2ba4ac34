"""Learning tracks: what each holds, what comes before the music, and how parts stand."""

from __future__ import annotations

import math
from fractions import Fraction

import pytest

from retune.errors import WishError
from retune.pitch import Pitch
from retune.score.model import PartKind
from retune.tracks.guides import CLICK, COUNT_IN, DRONE, STARTING_NOTES
from retune.tracks.leadin import beats_of, lead_in
from retune.tracks.learning import excerpt, learning_takes
from retune.tracks.options import Drone, StartingNotes, TrackOptions
from retune.tracks.take import Take
from retune.tuning.model import TunedNote, TunedScore
from retune.tuning.policy import Temperament
from retune.units import ratio_to_cents
from tests.tracks.pieces import NAMES, tuned

F = Fraction


def notes_of(played: TunedScore, name: str) -> list[TunedNote]:
    index = next(p.index for p in played.score.parts if p.name == name)
    return [one for one in played.notes if one.note.part == index]


def heard(take: Take) -> dict[str, float]:
    found = {p.name: take.strip(p.index) for p in take.played.score.parts}
    return {name: strip.gain_db for name, strip in found.items() if strip is not None}


def test_names_folders_and_order() -> None:
    takes = learning_takes(tuned("harbour-hymn"), TrackOptions())
    assert [take.name for take in takes[:4]] == [
        "Full mix",
        "Soprano predominant",
        "Soprano alone",
        "Soprano missing",
    ]
    assert [take.folder for take in takes[3:5]] == ["Soprano", "Alto"]
    assert len(takes) == 13
    assert [take.track for take in takes] == list(range(13))
    assert {take.of for take in takes} == {12}


def test_divided_parts_get_their_own() -> None:
    takes = learning_takes(tuned("regatta-day"), TrackOptions())
    assert {"Soprano 1", "Soprano 2"} <= {take.folder for take in takes}


def test_levels() -> None:
    takes = {t.name: heard(t) for t in learning_takes(tuned("lamp-night"), TrackOptions())}
    full, front = takes["Full mix"], takes["Alto predominant"]
    assert full["Soprano"] == full["Alto"] == full["Bass"] == 0.0
    assert full["Organ"] < 0.0
    # Common practice, no source: the others about 9 dB down.
    assert front["Alto"] - front["Tenor"] == pytest.approx(9.0)
    assert front["Organ"] <= front["Tenor"]
    assert "Alto" not in takes["Alto missing"]
    assert takes["Alto missing"]["Tenor"] == 0.0
    alone = takes["Alto alone"]
    assert {"Soprano", "Tenor", "Bass"}.isdisjoint(alone)
    assert "Organ" in alone


def test_accompaniment_can_be_left_out() -> None:
    wish = TrackOptions(accompaniment_db=-math.inf)
    for take in learning_takes(tuned("lamp-night"), wish):
        assert "Organ" not in heard(take)


@pytest.mark.parametrize("name", NAMES)
def test_all_tracks_line_up(name: str) -> None:
    takes = learning_takes(tuned(name), TrackOptions(sides=True, click=True))
    assert len({take.played.score.end for take in takes}) == 1
    assert len({take.played.score.tempo.changes for take in takes}) == 1
    plain = tuned(name)
    shift = takes[0].played.score.end - plain.score.end
    for take in takes:
        music = [n for n in take.played.notes if not take.played.score.parts[n.note.part].guides]
        assert [n.note.onset - shift for n in music] == [n.note.onset for n in plain.notes]
        assert [[s.cents for s in n.segments] for n in music] == [
            [s.cents for s in n.segments] for n in plain.notes
        ]


def test_starting_notes_rise_and_end_with_the_singers_own() -> None:
    piece = tuned("harbour-hymn")
    for take in learning_takes(piece, TrackOptions()):
        starting = notes_of(take.played, STARTING_NOTES)
        keys = [one.note.pitch.key for one in starting]
        chord = keys[:-1] if take.folder else keys
        # The hymn begins with an E flat major chord.
        assert [one.note.pitch.name for one in starting][: len(chord)] == [
            "Eb3",
            "Bb3",
            "Eb4",
            "G4",
        ]
        assert chord == sorted(chord)
        if take.folder:
            own = next(n for n in piece.notes if piece.score.parts[n.note.part].name == take.folder)
            assert starting[-1].note.pitch == own.note.pitch
            assert starting[-1].segments[0].cents == own.segments[0].cents
        # At their tuned pitch: a pure third and fifth above the bass.
        cents = {one.note.pitch.name: one.segments[0].cents for one in starting}
        third = 400.0 + cents["G4"] - cents["Eb4"]
        assert third == pytest.approx(ratio_to_cents(F(5, 4)), abs=0.5)


def test_own_note_even_where_the_part_enters_later() -> None:
    takes = {t.name: t for t in learning_takes(tuned("tide-motet"), TrackOptions())}
    entering = notes_of(takes["Bassus predominant"].played, STARTING_NOTES)[-1]
    own = notes_of(tuned("tide-motet"), "Bassus")[0]
    assert own.note.onset > 0
    assert entering.note.pitch == own.note.pitch


def test_starting_notes_of_the_tonic_alone_and_of_none() -> None:
    piece = tuned("evening-tide")  # A major
    tonic = learning_takes(piece, TrackOptions(starting_notes=StartingNotes.TONIC))[1]
    assert [n.note.pitch.name for n in notes_of(tonic.played, STARTING_NOTES)] == ["A3"]
    none = learning_takes(piece, TrackOptions(starting_notes=StartingNotes.NONE, count_in=0))[1]
    assert [part.name for part in none.played.score.parts] == [
        part.name for part in piece.score.parts
    ]
    assert none.played.score.end == piece.score.end


def test_a_pick_up_is_counted_in_by_a_bar_and_its_missing_beats() -> None:
    piece = tuned("regatta-day")
    first = piece.score.bars[0]
    assert (first.metre, first.begins) == ((4, 4), 3)
    take = learning_takes(piece, TrackOptions(starting_notes=StartingNotes.NONE))[0]
    clicks = notes_of(take.played, COUNT_IN)
    assert [n.note.onset for n in clicks] == [0, 1, 2, 3, 4, 5, 6]
    accents = [n.note.onset for n in clicks if n.note.velocity > 90]
    assert accents == [0, 4]
    assert take.played.notes[0].note.onset == 7


def test_compound_metres_are_counted_in_dotted_beats() -> None:
    piece = tuned("evening-tide")
    assert piece.score.bars[0].metre == (6, 8)
    take = learning_takes(piece, TrackOptions(starting_notes=StartingNotes.NONE, count_in=2))[0]
    assert [n.note.onset for n in notes_of(take.played, COUNT_IN)] == [0, F(3, 2), 3, F(9, 2)]


def test_the_click_goes_on_with_an_accent_at_each_bar() -> None:
    piece = tuned("regatta-day")
    take = learning_takes(piece, TrackOptions(click=True))[0]
    strong = {n.note.onset for n in notes_of(take.played, CLICK) if n.note.velocity > 90}
    numbered = [bar for bar in take.played.score.bars if bar.number and bar.begins == 0]
    assert {bar.onset for bar in numbered} <= strong
    for bar in numbered:
        assert len(beats_of(bar)) == bar.duration


def test_the_count_in_goes_at_the_tempo_of_the_first_bar() -> None:
    for name in NAMES:
        score = tuned(name).score
        lead = lead_in(score, 0, 4, 1)
        assert lead.silence.qpm in {change.qpm for change in score.tempo.changes}
        assert float(lead.slot * 60 / lead.silence.qpm) >= 0.9


def test_drone_on_the_tonic_follows_its_tuned_pitch() -> None:
    piece = tuned("harbour-hymn")
    take = learning_takes(piece, TrackOptions(drone=Drone.parse("tonic")))[0]
    (drone,) = notes_of(take.played, DRONE)
    assert drone.note.pitch == Pitch.parse("Eb3")
    shift = take.played.score.end - piece.score.end
    for chord, cents in zip(piece.harmony.chords, piece.root_cents, strict=True):
        if chord.root is not None and chord.root.name == "Eb":
            onset = chord.onset + shift
            here = next(s for s in drone.segments if s.onset <= onset < s.end)
            assert here.cents == pytest.approx(cents, abs=0.06)


def test_drone_on_roots_and_on_a_named_pitch() -> None:
    piece = tuned("evening-tide")
    roots = learning_takes(piece, TrackOptions(drone=Drone.parse("root")))[0]
    played = {n.note.pitch.pitch_class for n in notes_of(roots.played, DRONE)}
    assert played == {c.root for c in piece.harmony.chords if c.root is not None}
    fifth = learning_takes(piece, TrackOptions(drone=Drone.parse("E3")))[0]
    (drone,) = notes_of(fifth.played, DRONE)
    assert drone.note.pitch.name == "E3"
    # A pure fifth above the tonic A, which stands near 0 at the start: +1.955 cents.
    assert drone.segments[0].cents == pytest.approx(ratio_to_cents(F(3, 2)) - 700.0, abs=0.1)


def test_sides_stand_apart_and_say_so() -> None:
    takes = learning_takes(tuned("lamp-night"), TrackOptions(sides=True))
    take = next(one for one in takes if one.name == "Alto left, others right")
    assert take.sides
    pans = {p.name: take.strip(p.index) for p in take.played.score.parts}
    assert pans["Alto"] is not None
    assert pans["Alto"].pan == -1.0
    assert {pans[n].pan for n in ("Soprano", "Tenor", "Bass", "Organ")} == {1.0}  # type: ignore[union-attr]


def test_loops_are_counted_in_each_time() -> None:
    piece = excerpt(tuned("harbour-hymn"), "5-6")
    take = learning_takes(piece, TrackOptions(loops=3, starting_notes=StartingNotes.NONE))[0]
    assert take.played.score.end == 3 * (piece.score.end + 4)
    assert len(notes_of(take.played, COUNT_IN)) == 12
    soprano = notes_of(take.played, "Soprano")
    assert len(soprano) == 3 * len(notes_of(piece, "Soprano"))


def test_a_comparison_plays_both_tunings_in_turn() -> None:
    piece = tuned("harbour-hymn")
    equal = tuned("harbour-hymn", Temperament.EQUAL)
    take = learning_takes(piece, TrackOptions(compare="1-2"), equal)[-1]
    assert take.name == "Just and equal, bars 1-2"
    alto = notes_of(take.played, "Alto")
    half = len(alto) // 2
    assert [n.note.pitch for n in alto[:half]] == [n.note.pitch for n in alto[half:]]
    assert {s.cents for n in alto[half:] for s in n.segments} == {0.0}
    assert {s.cents for n in alto[:half] for s in n.segments} != {0.0}


def test_a_twin_in_equal_temperament_says_so() -> None:
    takes = learning_takes(tuned("harbour-hymn", Temperament.EQUAL), TrackOptions())
    assert takes[1].name == "Soprano predominant (equal)"


def test_only_chosen_parts() -> None:
    takes = learning_takes(tuned("harbour-hymn"), TrackOptions(parts=("alto",)))
    assert [take.folder for take in takes] == ["", "Alto", "Alto", "Alto"]
    with pytest.raises(WishError, match="no sung part is called 'Oboe'"):
        learning_takes(tuned("harbour-hymn"), TrackOptions(parts=("Oboe",)))


def test_instruments_get_no_tracks_where_people_sing() -> None:
    piece = tuned("gull-song")
    folders = {take.folder for take in learning_takes(piece, TrackOptions())}
    assert "Alto" in folders
    assert not any("Clarinet" in folder for folder in folders)


@pytest.mark.parametrize("text", ["", "H", "tonics", "D3x", "#"])
def test_drones_that_cannot_be(text: str) -> None:
    with pytest.raises(WishError, match="no drone"):
        Drone.parse(text)


@pytest.mark.parametrize(
    "wish",
    [
        {"count_in": -1},
        {"loops": 0},
        {"others_db": 3.0},
        {"accompaniment_db": 40.0},
        {"width": 1.5},
    ],
)
def test_options_out_of_range(wish: dict[str, float]) -> None:
    with pytest.raises(WishError, match="cannot be"):
        TrackOptions(**wish)  # type: ignore[arg-type]


def test_guide_parts_are_no_music() -> None:
    take = learning_takes(tuned("evening-tide"), TrackOptions(drone=Drone()))[1]
    kinds = [part.kind for part in take.played.score.parts if part.guides]
    assert kinds == [PartKind.GUIDE, PartKind.CLICK, PartKind.GUIDE]
    assert take.tuned == tuned("evening-tide")
