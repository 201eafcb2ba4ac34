"""`retune chord`: one chord, its ratios, beats, shared partials and what else it could be."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click
from click.core import ParameterSource

from retune.cli.console import say, width, working, wrapped
from retune.cli.options import examples, source_of, talk_options, tuning_options
from retune.cli.policy_options import Tonic
from retune.cli.report import report_findings
from retune.errors import WishError
from retune.score.model import VoiceType
from retune.voice.options import VOWELS

if TYPE_CHECKING:
    from retune.choicesfile.model import ChoicesFile
    from retune.chordcard.found import FoundChord
    from retune.pitch import Pitch, PitchClass
    from retune.score.options import ReadOptions
    from retune.tuning.policy import Policy

_WITHOUT_SCORE = {"pitches", "root", "voices", "audio", "picture", "vowel", "as_json", "quiet"} | {
    "prime_limit",
    "reference",
    "tonic",
}
"""What can be wished of pitches alone."""
VOICE_CAUTION = (
    "Start with the volume low. If you sing with it: do not force pitch, vowel or volume, and "
    "stop if it hurts or turns hoarse."
)


@click.command(
    "chord",
    short_help="One chord: ratios, beats, partials, alternatives.",
    epilog=examples(
        "retune chord D3 F#4 A4 D5",
        "retune chord C3 E3 G3 Bb3 --prime-limit 7 --audio seventh.mp3",
        "retune chord A2 E3 C4 E4 --picture minor.svg --reference 442",
        "retune chord --from hymn.musicxml --at 12:3",
    ),
)
@click.argument("pitches", nargs=-1, metavar="[PITCH]...")
@click.option(
    "--from",
    "score",
    type=click.Path(path_type=Path, allow_dash=True),
    is_eager=True,
    metavar="SCORE",
    help="The chord that sounds at a place of a score, as tuned there.",
)
@click.option("--at", "place", metavar="BAR:BEAT", help="The place, as 12:3 or 12:3.5.")
@click.option(
    "--pass",
    "run",
    type=click.IntRange(1),
    metavar="N",
    help="Which time through, where the bar is repeated.  [default: 1]",
)
@click.option(
    "--root", type=Tonic(), metavar="PITCH", help="Hear it on this root.  [default: found]"
)
@click.option(
    "--voices",
    metavar="NAMES",
    help="Who sings, low to high, as bass,tenor,alto,soprano.  [default: by height]",
)
@click.option(
    "--audio",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="Hear it equal and just by turns, then gliding: .mp3, .wav, .flac, .ogg.",
)
@click.option(
    "--picture",
    type=click.Path(path_type=Path),
    metavar="FILE",
    help="See its partials in both tunings: .svg, .png, .pdf.",
)
@click.option(
    "--vowel",
    type=click.Choice(VOWELS),
    default="neutral",
    show_default=True,
    metavar="NAME",
    help="Vowel of --audio and --picture.",
)
@click.option("--json", "as_json", is_flag=True, help="One JSON document instead of text.")
@tuning_options
@talk_options
@click.pass_context
def command(
    ctx: click.Context,
    pitches: Sequence[str],
    score: Path | None,
    place: str | None,
    run: int | None,
    root: PitchClass | None,
    voices: str | None,
    audio: Path | None,
    picture: Path | None,
    vowel: str,
    as_json: bool,
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> None:
    """Show one chord of 1 to 12 PITCHes, such as D3 F#4 A4 D5.

    What it is, each tone's ratio, cents and frequency, how fast its pairs beat in equal
    temperament and just, which partials meet, roughness, vowels that bring a shared partial
    out, other ratios for it, and other tones in the bass. A pitch without an octave is the
    next one above the one before it. Its root is where a piano has it, unless --tonic places it
    in a just scale. Of the tuning's options, pitches alone take --prime-limit, --reference and
    --tonic; the others go with --from.
    """
    _check_usage(ctx, bool(pitches), score, vowel_used=bool(audio or picture))
    if score is not None:
        found = _from_score(score, place or "", run, policy, reading, choices, all_findings, quiet)
    else:
        found = _from_pitches(pitches, root, voices, policy)
    files = _files(found, audio, picture, vowel)
    if as_json:
        from retune.cli.chordjson import chord_json

        click.echo(chord_json(found))
    else:
        from retune.cli.chordlines import chord_lines

        click.echo("\n".join(chord_lines(found, width())))
    _write(files, quiet)


def _check_usage(
    ctx: click.Context, pitches: bool, score: Path | None, *, vowel_used: bool
) -> None:
    """Raise `UsageError` for wishes that bear on nothing."""
    given = {
        param.name: param.opts[-1]
        for param in ctx.command.params
        if param.name is not None
        and ctx.get_parameter_source(param.name) is ParameterSource.COMMANDLINE
    }
    if score is None:
        if not pitches:
            raise click.UsageError("give pitches, as D3 F#4 A4, or --from SCORE --at BAR:BEAT")
        for name, option in given.items():
            if name not in _WITHOUT_SCORE and isinstance(option, str) and option.startswith("-"):
                raise click.UsageError(f"{option} goes with --from SCORE")
    else:
        if pitches:
            raise click.UsageError("give pitches, or --from SCORE --at BAR:BEAT, not both")
        if "place" not in given:
            raise click.UsageError("--from goes with --at BAR:BEAT")
        for name in ("root", "voices"):
            if name in given:
                raise click.UsageError(f"{given[name]} goes with pitches, not with --from")
    if "vowel" in given and not vowel_used:
        raise click.UsageError("--vowel goes with --audio or --picture")


def _from_score(
    score: Path,
    place: str,
    run: int | None,
    policy: Policy,
    reading: ReadOptions,
    choices: ChoicesFile | None,
    all_findings: bool,
    quiet: bool,
) -> FoundChord:
    from retune import pipeline
    from retune.chordcard.fromscore import chord_at, onset_at

    source, name = source_of(score)
    with working(f"Tuning {name}", quiet):
        tuned = pipeline.retuned(source, name, reading, policy, choices)
    found = chord_at(tuned, onset_at(tuned.score, place, run))
    if not quiet and all_findings:
        report_findings(tuned, all_findings)
    return found


def _from_pitches(
    words: Sequence[str], root: PitchClass | None, voices: str | None, policy: Policy
) -> FoundChord:
    from retune.chordcard.found import chord_of
    from retune.chordcard.naming import parse_pitches

    pitches = parse_pitches(words)
    return chord_of(
        pitches,
        policy.prime_limit,
        policy.reference_hz,
        root,
        policy.tonic,
        _voices(voices, pitches),
    )


def _voices(wish: str | None, pitches: Sequence[Pitch]) -> tuple[VoiceType, ...]:
    if wish is None:
        return ()
    from retune.export.options import did_you_mean

    known = {kind.value: kind for kind in VoiceType}
    names = [name.strip().lower() for name in wish.split(",")]
    for name in names:
        if name not in known:
            raise WishError(
                f"'{name}' is no kind of voice",
                hint=f"{did_you_mean(name, known)}It is one of {', '.join(known)}",
            )
    if len(names) != len(pitches):
        raise WishError(
            f"--voices names {len(names)} for {len(pitches)} pitches", hint="Name one for each"
        )
    return tuple(known[name] for name in names)


def _files(
    chord: FoundChord, audio: Path | None, picture: Path | None, vowel: str
) -> list[tuple[Path, Any]]:
    """What is to be written, as (folder, file); nothing is rendered yet."""
    from retune.cli.chordlines import full_title

    files: list[tuple[Path, Any]] = []
    title = full_title(chord)
    if audio is not None:
        _require_ending("--audio", audio, _SOUNDS)
        from retune.export.chord_sound import chord_sound

        files.append((audio.parent, chord_sound(chord, audio.name, title, vowel)))
    if picture is not None:
        _require_ending("--picture", picture, ("svg", "png", "pdf"))
        from retune.export.chord_picture import chord_picture

        files.append((picture.parent, chord_picture(chord, picture.name, title, vowel)))
    return files


def _require_ending(option: str, path: Path, known: Sequence[str]) -> None:
    if path.suffix.lower().removeprefix(".") not in known:
        allowed = ", ".join(f".{ending}" for ending in known)
        raise click.BadParameter(f"'{path}' ends in none of {allowed}", param_hint=option)


def _write(files: Sequence[tuple[Path, Any]], quiet: bool) -> None:
    if not files:
        return
    from retune.adapters.disk import write_all

    for folder in dict.fromkeys(folder for folder, _ in files):
        own = [file for place, file in files if place == folder]
        with working("Rendering", quiet):
            report = write_all(own, folder)
        if quiet:
            continue
        for file in report.written:
            about = f": {file.note}" if file.note else ""
            say(wrapped(f"Wrote {folder / file.name}{about}", "  "))
    if not quiet and any(file.name.rpartition(".")[2].lower() in _SOUNDS for _, file in files):
        say(wrapped(VOICE_CAUTION))


_SOUNDS = ("mp3", "wav", "flac", "ogg")
