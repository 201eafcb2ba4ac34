"""Vowels of sung words against what textbooks of diction and pronouncing dictionaries give.

The values are IPA of single words, recalled from memory unless a comment says otherwise: Latin
after the preface of the Liber Usualis, German lengths after the usual pronouncing dictionaries,
Italian open and close vowels after the Tuscan usage of the dictionaries.
"""

from __future__ import annotations

import unicodedata
from pathlib import Path

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from retune.errors import WishError
from retune.score.read import read
from retune.voice.language import LANGUAGES, VOWELS, vowels

FIXTURES = Path(__file__).parents[2] / "fixtures"


def lyrics(words: str) -> list[str]:
    """Lyrics of words written as "Glo-ri-a in"."""
    return [lyric for word in words.split() for lyric in word.replace("-", "- ").split()]


def sung(words: str, language: str) -> str:
    return " ".join(vowels(lyrics(words), language))


# Words of the Ordinary of the Mass and of common motets.
LATIN = {
    "Ky-ri-e e-le-i-son": "i i ɛ ɛ ɛ i ɔ",
    "e-lei-son": "ɛ ɛ ɔ",
    "Glo-ri-a in ex-cel-sis De-o": "ɔ i a i ɛ ɛ i ɛ ɔ",
    "et in ter-ra pax ho-mi-ni-bus": "ɛ i ɛ a a ɔ i i u",
    "bo-næ vo-lun-ta-tis": "ɔ ɛ ɔ u a i",
    "Lau-da-mus te": "a a u ɛ",
    "Cre-do in u-num De-um": "ɛ ɔ i u u ɛ u",
    "fac-to-rem cæ-li": "a ɔ ɛ ɛ i",
    "cœ-li coe-li cae-lum": "ɛ i ɛ i ɛ u",
    "Je-sum Ie-su Chris-te": "ɛ u ɛ u i ɛ",
    "qui tol-lis pec-ca-ta": "i ɔ i ɛ a a",
    "quo-ni-am tu so-lus": "ɔ i a u ɔ u",
    "San-ctus Do-mi-nus": "a u ɔ i u",
    "Ple-ni sunt": "ɛ i u",
    "Ho-san-na": "ɔ a a",
    "A-gnus De-i": "a u ɛ i",
    "mi-se-re-re": "i ɛ ɛ ɛ",
    "A-ve ve-rum Cor-pus": "a ɛ ɛ u ɔ u",
    "san-guis lin-gua an-gue-lus": "a i i a a ɛ u",
    "al-le-lu-ia al-le-lu-ja": "a ɛ u a a ɛ u a",
    "e-ius cu-jus": "ɛ u u u",
    "Re-qui-em æ-ter-nam": "ɛ i ɛ ɛ ɛ a",
    "O ma-gnum my-ste-ri-um": "ɔ a u i ɛ i u",
    "ju-bi-la-te Iu-bi-la-te": "u i a ɛ u i a ɛ",
    "Is-ra-ël": "i a ɛ",
    "sæ-cu-lo-rum A-men": "ɛ u ɔ u a ɛ",
    "Be-a-ta Ma-ri-a Vir-go": "ɛ a a a i a i ɔ",
    "cu-i cui huic": "u i u u",
}
ITALIAN = {
    "a-mor a-mo-re": "a o a o e",
    "il cuo-re": "i ɔ e",
    "cie-lo ciel": "ɛ o ɛ",
    "gior-no già": "o o a",
    "la-scia-te scin-til-la": "a a e i i a",
    "fi-glio fi-glia": "i o i a",
    "bel-la stel-la": "ɛ a e a",
    "bel-lez-za": "e e a",
    "que-sto quel-lo": "e o e o",
    "guer-ra": "ɛ a",
    "not-te mor-te": "ɔ e ɔ e",
    "dol-ce vo-ce": "o e o e",
    "mon-do so-le": "o o o e",
    "pie-tà vir-tù": "e a i u",
    "per-ché però": "e e ɔ",
    "o-ro co-sa": "ɔ o ɔ a",
    "so-no don-na": "o o ɔ a",
    "mio tua": "i u",
    "mi-o lui": "i o u",
    "sem-pre ben-e": "ɛ e ɛ e",
    "l'al-ma l'on-de": "a a o e",
    "poi noi": "ɔ o",
    "pa-ce sa-crò": "a e a ɔ",
}
GERMAN = {
    "Lie-be Frie-de": "i ə i ə",
    "Nacht wacht Tag": "a a a",
    "Licht ich nicht": "ɪ ɪ ɪ",
    "Son-ne Son-nen-schein": "ɔ ə ɔ ə a",
    "Mond Trost hoch": "o o o",
    "Gott Wort voll": "ɔ ɔ ɔ",
    "Brot Lob lo-ben": "o o o ə",
    "Herr Herz mehr": "ɛ ɛ e",
    "See-le See'n": "e ə e",
    "le-ben ge-ben": "e ə e ə",
    "be-ten Ge-bet": "e ə ə e",
    "be-gin-nen ge-bo-ren": "ə ɪ ə ə o ə",
    "ge-ge-ben ge-we-sen": "ə e ə ə e ə",
    "ver-ges-sen er-he-ben": "ɛ ɛ ə ɛ e ə",
    "wer-den Er-de Schwert": "e ə e ə e",
    "Freu-de Bäu-me": "ɔ ə ɔ ə",
    "Stein Mai Haus": "a a a",
    "schön Kö-nig": "ø ø ɪ",
    "Göt-ter köst-lich": "œ ə œ ɪ",
    "hö-ren hört": "ø ə ø",
    "ü-ber grü-ßen": "y ə y ə",
    "Mut-ter un-ser": "ʊ ə ʊ ə",
    "gut Ruh du": "u u u",
    "Kuß Kuss muß": "ʊ ʊ ʊ",
    "Him-mel Kin-der": "ɪ ə ɪ ə",
    "ihm ihr wir": "i i i",
    "in im mit bin": "ɪ ɪ ɪ ɪ",
    "sel'-ge ew'-ge": "e ə e ə",
    "hei-li-ge e-wig": "a ɪ ə e ɪ",
    "Mäd-chen trägt": "ɛ ə ɛ",
    "Wie-gen-lied": "i ə i",
    "Vö-gel Vo-gel": "ø ə o ə",
    "Ju-gend Tu-gend": "u ə u ə",
    "Christ Je-sus": "ɪ e ʊ",
    "Bru-der Blut": "u ə u",
    "ed-le täg-lich": "e ə ɛ ɪ",
    "Quel-le": "ɛ ə",
    "komm, o komm": "ɔ o ɔ",
}
ENGLISH = {
    "love come son blood": "ʌ ʌ ʌ ʌ",
    "heav-en sev-en": "ɛ ə ɛ ə",
    "light my eyes": "a a a",
    "day great they": "e e e",
    "go soul home": "o o o",
    "thou now down": "a a a",
    "voice joy": "ɔ ɔ",
    "call law lord": "ɔ ɔ ɔ",
    "bird earth word her": "ɜ ɜ ɜ ɜ",
    "good would full": "ʊ ʊ ʊ",
    "moon through true": "u u u",
    "ho-ly on-ly": "o i o i",
    "the moon the earth": "ə u i ɜ",
    "glo-ri-ous glo-rious": "ɔ i ə ɔ ə",
    "bless-ed blest": "ɛ ɪ ɛ",
    "heav'n pow'r ev'-ry": "ɛ a ɛ i",
    "moon-light some-where": "u a ʌ ɛ",
    "lov-ing lone-some": "ʌ ɪ o ə",
    "al-le-lu-ia": "æ ɛ u a",
    "A-men": "a ɛ",
    "har-bor har-bour": "a ə a ə",
    "fa-ther moth-er": "a ə ʌ ə",
    "lit-tle trem-ble": "ɪ ə ɛ ə",
}
TABLES = {"latin": LATIN, "italian": ITALIAN, "german": GERMAN, "english": ENGLISH}
CASES = [(name, words, ipa) for name, table in TABLES.items() for words, ipa in table.items()]


@pytest.mark.parametrize(("language", "words", "ipa"), CASES)
def test_textbook_words(language: str, words: str, ipa: str) -> None:
    assert sung(words, language) == ipa


@pytest.mark.parametrize(
    ("written", "language", "ipa"),
    [
        (["", "Glo-", "", "-", "ri-", "a_", "__"], "latin", "neutral ɔ ɔ ɔ i a a"),
        (["1. Ký-", "ri-", "é"], "latin", "i i ɛ"),
        (["„Licht“,", "‚ich‘", "(Mond)", "du?!"], "german", "ɪ ɪ o u"),
        (["“LOVE,”", "'tis", "God’s", "—come…"], "english", "ʌ ɪ ɔ ʌ"),
        (["Mond-", "-licht"], "german", "o ɪ"),
        (["wer -", "den"], "german", "e ə"),
        (["2.", "Moon‐", "light"], "english", "neutral u a"),
        (["Mm", "", "Ooh", "Ah", "Mm"], "english", "neutral neutral u a neutral"),
        (["Oo", "", "Ooh"], "german", "u u u"),
        # The most open vowel of an elision is held; of two alike the last.
        (["glo-", "ria_e"], "italian", "ɔ a"),
        (["al-", "ma‿il", "co-", "re"], "italian", "a a ɔ e"),
        (["che\u00a0in-", "fin"], "italian", "e i"),
        (["ky-", "ri-", "e e-", "lei-", "son"], "latin", "i i ɛ ɛ ɔ"),
    ],
)
def test_lyrics_as_scores_write_them(written: list[str], language: str, ipa: str) -> None:
    assert " ".join(vowels(written, language)) == ipa


@pytest.mark.parametrize("language", LANGUAGES)
def test_composed_and_decomposed_accents_read_alike(language: str) -> None:
    words = lyrics("schö-ne Glück Tü-re per-ché cæ-lum ǽ-vo è bless-èd Ký-ri-e Is-ra-ël fuß")
    apart = [unicodedata.normalize("NFD", word) for word in words]
    assert vowels(apart, language) == vowels(words, language)


def test_unknown_language() -> None:
    with pytest.raises(WishError) as caught:
        vowels(["la"], "germann")
    assert "Did you mean german?" in caught.value.hint
    assert all(name in caught.value.hint for name in LANGUAGES)


_TEXT = st.text(alphabet=st.characters(codec="utf-8"), max_size=8)
_WORDY = st.text(alphabet="abcdefghiklmnopqrstuvwyzäöüßèòæëhcgq'’-_‿ .1\u00a0\u0301", max_size=9)


@settings(max_examples=150, deadline=None)
@given(st.lists(_TEXT | _WORDY, max_size=8), st.sampled_from(LANGUAGES))
@example(["'-", "-'", "İ-", "ſ", "e'"], "english")
def test_any_text_gives_a_vowel_for_every_note(written: list[str], language: str) -> None:
    found = vowels(written, language)
    assert len(found) == len(written)
    assert set(found) <= set(VOWELS)


@pytest.mark.parametrize("language", LANGUAGES)
def test_a_hyphen_after_every_note(language: str) -> None:
    assert len(vowels(["love-"] * 3000, language)) == 3000


# The invented words of the project's own scores, as their words are commonly sung (no source).
@pytest.mark.parametrize(
    ("piece", "language", "part", "ipa"),
    [
        (
            "lamp-night",
            "german",
            0,
            "ʊ ə i i ʊ ʊ ɪ e ɔ a ə a ə ɪ ɪ ə a ʊ a u a ə u a ə u ə a u ə a",
        ),
        ("harbour-hymn", "english", 0, "ɛ ə ɛ æ ɛ ə ɔ ɪ ɛ ə æ ə ɔ ə i ɛ ɛ ə æ æ ɛ æ i ɪ"),
        ("tide-motet", "latin", 4, "u ɛ a a a i a a ɛ a a ɛ ɛ a a a ɛ ɛ a a a ɛ i ɔ u i ɛ a"),
    ],
)
def test_own_scores(piece: str, language: str, part: int, ipa: str) -> None:
    score = read(FIXTURES / f"{piece}.musicxml")
    words = [note.lyric for note in score.notes if note.part == part]
    expected = ipa.split()
    assert vowels(words, language)[: len(expected)] == expected
