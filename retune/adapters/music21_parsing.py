"""The door to music21: parsing text, quietly and safely, and turning its scores into ours.

music21 is imported when a file is read, never before. Text is handed to its parsers itself, so
that no cache of pickles, no file and no address on the network is touched. What it prints about
a file is kept; what it raises is one clear error.
"""

from __future__ import annotations

import gc
import io
from collections.abc import Iterator
from contextlib import contextmanager, redirect_stderr, redirect_stdout
from dataclasses import dataclass, field, replace
from typing import Any
from warnings import catch_warnings, simplefilter

from retune.adapters.notation_parts import PartReader
from retune.errors import Finding, RetuneError, UnreadableError, Weight
from retune.written import WrittenScore


@dataclass
class Said:
    """What music21 printed while it worked."""

    lines: list[str] = field(default_factory=list)

    def told(self, score: WrittenScore) -> WrittenScore:
        """The score with a finding for each line; what could not be read is a loss."""
        findings = tuple(
            Finding(Weight.LOSS if "rror" in line else Weight.DOUBT, f"music21: {line}")
            for line in dict.fromkeys(self.lines)
        )
        return replace(score, findings=score.findings + findings)


@contextmanager
def guarded(name: str) -> Iterator[Said]:
    """Keep music21's output from the user and its exceptions from the caller.

    The garbage collector rests meanwhile: music21 makes cycles by the ten thousand, and parses
    up to 1.9 times as fast without it.

    Raises
    ------
    UnreadableError
        For whatever music21 raises; `name` is the name of the format.
    """
    said, output, collecting = Said(), io.StringIO(), gc.isenabled()
    gc.disable()
    try:
        with catch_warnings(), redirect_stderr(output), redirect_stdout(output):
            simplefilter("ignore")
            yield said
    except RetuneError:
        raise
    except Exception as fault:
        reason = next(iter(str(fault).splitlines()), "") or type(fault).__name__
        raise UnreadableError(
            f"this is not a {name} score that can be read ({reason})",
            hint="Check the file's format, or export the score as MusicXML",
        ) from fault
    finally:
        if collecting:
            gc.enable()
        printed = (line.split("WARNING:")[-1].strip() for line in output.getvalue().splitlines())
        said.lines.extend(line for line in printed if line)


def parse(text: str, format: str) -> list[Any]:
    """The music21 scores in a text; call it inside `guarded`."""
    from music21 import converter

    reader = converter.Converter()
    reader.parseData(text, format=format)
    stream: Any = reader.stream
    return list(stream.scores) if "Opus" in stream.classes else [stream]


def written(score: Any, format: str) -> WrittenScore:
    """A music21 score as a written score; call it inside `guarded`."""
    sounding = score.toSoundingPitch()
    about = score.metadata
    return WrittenScore(
        parts=tuple(
            PartReader(_in_bars(part), number).read()
            for number, part in enumerate(sounding.parts or [sounding], start=1)
        ),
        title=_first(about, "title", "movementName"),
        composer=_first(about, "composer"),
        lyricist=_first(about, "lyricist"),
        copyright=_first(about, "copyright"),
        format=format,
    )


def _in_bars(part: Any) -> Any:
    """The part itself if it is barred; else barred by its time signatures, 4/4 without one."""
    if part.hasMeasures():
        return part
    barred = part.makeMeasures()
    barred.makeTies(inPlace=True)
    return barred


def _first(about: Any, *names: str) -> str:
    values = (getattr(about, name, None) for name in names)
    return next((" ".join(str(value).split()) for value in values if value), "")
