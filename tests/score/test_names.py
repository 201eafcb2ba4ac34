"""What part names say. The words of the trade in several languages: common practice, no source."""

from __future__ import annotations

import pytest

from retune.score.model import VoiceType
from retune.score.names import Role, read_name, singers_named

S, M, A, T, R, B = VoiceType


@pytest.mark.parametrize(
    ("name", "types"),
    [
        ("Soprano", [S]),
        ("SOPRANO", [S]),
        ("Sopran", [S]),
        ("Sopr.", [S]),
        ("S.", [S]),
        ("Cantus", [S]),
        ("Canto", [S]),
        ("Superius", [S]),
        ("Descant", [S]),
        ("Mezzo-Soprano", [M]),
        ("Mezzosopran", [M]),
        ("Altus", [A]),
        ("Alt", [A]),
        ("Contralto", [A]),
        ("Haute-contre", [A]),
        ("Ténor", [T]),
        ("Tenore", [T]),
        ("Tenor II", [T]),
        ("Baryton", [R]),
        ("Bass-baritone", [R]),
        ("Bassus", [B]),
        ("Basse", [B]),
        ("Bajo", [B]),
        ("Bas", [B]),
        ("BASS", [B]),
        ("Choir 1 Soprano", [S]),
        ("1. Sopran", [S]),
        ("S/A", [S, A]),
        ("SA", [S, A]),
        ("S. A.", [S, A]),
        ("Soprano Alto", [S, A]),
        ("Sopran und Alt", [S, A]),
        ("Sopranos & Altos", [S, A]),
        ("Women", [S, A]),
        ("Männer", [T, B]),
        ("Tenor/Bass", [T, B]),
        ("Baritone/Bass", [R, B]),
        ("SATB", [S, A, T, B]),
        ("SSAA", [S, S, A, A]),
        ("Soprano I/II", [S, S]),
    ],
)
def test_singers(name: str, types: list[VoiceType]) -> None:
    reading = read_name(name)
    assert reading.role is Role.SINGERS
    assert [label.voice_type for label in reading.labels] == types


@pytest.mark.parametrize(
    ("name", "role"),
    [
        ("Piano", Role.KEYBOARD),
        ("Klavier", Role.KEYBOARD),
        ("Orgue", Role.KEYBOARD),
        ("Cembalo", Role.KEYBOARD),
        ("Harp", Role.FIXED),
        ("Gitarre", Role.FIXED),
        ("Glockenspiel", Role.FIXED),
        ("Timpani", Role.FIXED),
        ("Violin I", Role.INSTRUMENT),
        ("Alto Saxophone", Role.INSTRUMENT),
        ("Bass Clarinet", Role.INSTRUMENT),
        ("Double Bass", Role.INSTRUMENT),
        ("Basso continuo", Role.INSTRUMENT),
        ("Maria B", Role.UNKNOWN),
        ("Part 1", Role.UNKNOWN),
        ("", Role.UNKNOWN),
        ("Quintus", Role.SINGERS),
        ("Coro", Role.SINGERS),
    ],
)
def test_others(name: str, role: Role) -> None:
    reading = read_name(name)
    assert reading.role is role
    assert reading.labels == ()


@pytest.mark.parametrize(
    ("name", "names"),
    [
        ("S1", ["Soprano 1"]),
        ("T2", ["Tenor 2"]),
        ("Sop 1", ["Soprano 1"]),
        ("Tenor 1 & 2", ["Tenor 1", "Tenor 2"]),
        ("Sopran und Alt", ["Soprano", "Alto"]),
        # One voice in whole words keeps the name that its singers know.
        ("Sopran", ["Sopran"]),
        ("Tenor II", ["Tenor II"]),
        ("Choir 1 Soprano:", ["Choir 1 Soprano"]),
    ],
)
def test_steady_names(name: str, names: list[str]) -> None:
    assert [label.name for label in read_name(name).labels] == names


@pytest.mark.parametrize(
    ("name", "reduction"),
    [
        ("Piano (for rehearsal only)", True),
        ("Klavierauszug", True),
        ("Piano reduction", True),
        ("Klavier (zum Üben)", True),
        ("Piano", False),
        ("Soprano", False),
    ],
)
def test_reductions(name: str, reduction: bool) -> None:
    assert read_name(name).reduction is reduction


@pytest.mark.parametrize(
    ("text", "types"),
    [("A.", [A]), ("S. solo", [S]), ("Tenors only", [T]), ("S. & A.", [S, A]),
     ("a tempo", []), ("solo", []), ("dolce", []), ("", [])],
)  # fmt: skip
def test_singers_in_words(text: str, types: list[VoiceType]) -> None:
    assert [label.voice_type for label in singers_named(text)] == types
