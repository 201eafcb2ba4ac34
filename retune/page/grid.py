"""The score as a plain grid of chords and parts, for scores that the engraver cannot take."""

from __future__ import annotations

from html import escape

from retune.harmony.symbols import doubtable_symbol, printed
from retune.page.engrave_labels import signed
from retune.tuning.model import Segment, TunedNote, TunedScore
from retune.tuning.sounding import sung_by_chord


def grid(tuned: TunedScore) -> str:
    """An HTML table: a row a chord, a column a part."""
    score = tuned.score
    heads = "".join(f'<th scope="col">{escape(part.name)}</th>' for part in score.parts)
    rows = []
    for chord, row in zip(tuned.harmony.chords, sung_by_chord(tuned), strict=True):
        if chord.root is None:
            continue
        bar, root = score.bar_at(chord.onset), tuned.root_cents[chord.index] or 0.0
        symbol = escape(printed(doubtable_symbol(chord)))
        cells = "".join(_cell(part.index, row.get(part.index), root) for part in score.parts)
        rows.append(
            f'<tr data-row="{chord.index}"><td>{escape(bar.number)}</td>'
            f"<td>{score.beat_at(chord.onset)}</td>"
            f'<td class="chord" data-chord="{chord.index}">{symbol}</td>'
            f"{cells}</tr>"
        )
    return (
        '<div class="scroll"><table class="grid"><thead><tr><th scope="col">Bar</th>'
        f'<th scope="col">Beat</th><th scope="col">Chord</th>{heads}</tr></thead>'
        f"<tbody>{''.join(rows)}</tbody></table></div>"
    )


def _cell(part: int, sung: tuple[TunedNote, Segment] | None, root: float) -> str:
    if sung is None:
        return f'<td data-part="{part}"></td>'
    note, segment = sung
    cents = round(segment.cents - root)
    small = " small" if abs(cents) <= 5 else ""
    word = f'<span class="word">{escape(note.note.lyric)}</span>' if note.note.lyric else ""
    return (
        f'<td data-part="{part}">{escape(printed(note.note.pitch.name))} '
        f'<span class="cents{small}">{signed(cents)}</span>{word}</td>'
    )
