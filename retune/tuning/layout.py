"""The unknowns of the solve: every note cut into pieces that hold one pitch, and what sounds when.

Conventions
-----------
* A piece is the part of one note inside one chord; in long chords it is cut further, so that
  the solve's band stays narrow. Pieces are numbered by first slice, then part, then key.
* A cell is one piece in one slice. Cells stand in slice order.
* Chords are numbered as in `Harmony.chords`; -1 where there is none.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from retune.harmony.model import Harmony
from retune.score.model import Score
from retune.tuning.intervals import Flags, Floats, Ints
from retune.tuning.ratios import DEGREES

_WIDEST = 64
"""Most pieces that should begin while another sounds on in one chord."""


@dataclass(frozen=True)
class Layout:
    """A score and its harmony as arrays.

    Parameters
    ----------
    note, fragment, chord, first, last : ndarray of int, shape (pieces,)
        Indices into the score's notes and the harmony's fragments and chords; slices.
    part, key, fifths : ndarray of int, shape (pieces,)
    degree : ndarray of int, shape (pieces,)
        0 root to 3 seventh; -1 for non-chord tones.
    tuned, lone : ndarray of bool, shape (pieces,)
        Whether its part follows the just targets; whether it never sounds with another pitch
        class.
    cell_piece, cell_slice : ndarray of int, shape (cells,)
    quarters : ndarray, shape (slices,)
        Length of each slice in quarter notes.
    voices : ndarray of int, shape (slices,)
        How many tuned notes sound in each slice.
    accompanied : ndarray of bool, shape (slices,)
        Whether a part that cannot move sounds.
    held : ndarray of int, shape (links, 2)
        Neighbouring pieces of one note.
    melodic : ndarray of int, shape (links, 2)
        Last and first piece of two notes that follow each other in one part without a rest.
    """

    note: Ints
    fragment: Ints
    chord: Ints
    first: Ints
    last: Ints
    part: Ints
    key: Ints
    fifths: Ints
    degree: Ints
    tuned: Flags
    lone: Flags
    cell_piece: Ints
    cell_slice: Ints
    quarters: Floats
    voices: Ints
    accompanied: Flags
    held: Ints
    melodic: Ints

    @property
    def length(self) -> Floats:
        """Length of each piece in quarter notes."""
        ends = np.concatenate(([0.0], np.cumsum(self.quarters)))
        lengths: Floats = ends[self.last] - ends[self.first]
        return lengths

    def per_piece(self, cell_values: Floats) -> Floats:
        """Sum of a value of each cell over the cells of each piece."""
        count = len(self.note)
        sums: Floats = np.bincount(self.cell_piece, cell_values, minlength=count).astype(float)
        return sums


def _ints(values: object) -> Ints:
    return np.array(values, dtype=np.int64)


def _grown(first: Ints, last: Ints) -> tuple[Ints, Ints]:
    """Owner and slice of each cell of the runs first:last."""
    counts = last - first
    owner = np.repeat(np.arange(len(first)), counts)
    begin = np.cumsum(counts) - counts
    return owner, first[owner] + np.arange(len(owner)) - begin[owner]


def _lone_pieces(cell_piece: Ints, cell_slice: Ints, chroma: Ints, slices: int) -> Flags:
    """Whether all of a piece's slices sound nothing but its own pitch class."""
    low = np.full(slices, 12)
    high = np.full(slices, -1)
    np.minimum.at(low, cell_slice, chroma[cell_piece])
    np.maximum.at(high, cell_slice, chroma[cell_piece])
    company = np.bincount(cell_piece, (low != high)[cell_slice], minlength=len(chroma))
    alone: Flags = company == 0
    return alone


def _melodic_links(first: Ints, last: Ints, note: Ints, part: Ints, key: Ints) -> Ints:
    """Pairs of pieces of notes that abut in one part; of several, the nearest in pitch."""
    other = note[1:] != note[:-1]
    final = np.flatnonzero(np.append(other, True)[: len(note)])
    initial = np.flatnonzero(np.insert(other, 0, True)[: len(note)])
    ending: dict[tuple[int, int], list[int]] = {}
    for piece in final.tolist():
        ending.setdefault((int(part[piece]), int(last[piece])), []).append(piece)
    links = []
    for piece in initial.tolist():
        before = ending.get((int(part[piece]), int(first[piece])))
        if before:
            near = min(before, key=lambda other: abs(int(key[other]) - int(key[piece])))
            links.append((near, piece))
    return _ints(links).reshape(-1, 2)


def _degrees(harmony: Harmony) -> Ints:
    number = {degree: index for index, degree in enumerate(DEGREES)}
    return _ints([-1 if f.degree is None else number[f.degree] for f in harmony.fragments])


def lay_out(score: Score, harmony: Harmony) -> Layout:
    """Cut the notes into pieces and find what sounds together and what follows what."""
    notes, fragments, slices = score.notes, harmony.fragments, harmony.slices
    crowd = max((len(one.notes) for one in slices), default=1)
    stride = max(1, _WIDEST // max(crowd, 1))
    begin = _ints([chord.first for chord in harmony.chords])
    chord_of = _ints([f.chord for f in fragments])
    note_of = _ints([f.note for f in fragments])
    owner, place = _grown(_ints([f.first for f in fragments]), _ints([f.last for f in fragments]))

    block = (place - begin[chord_of[owner]]) // stride
    new = np.insert((owner[1:] != owner[:-1]) | (block[1:] != block[:-1]), 0, True)[: len(owner)]
    piece_of_cell = np.cumsum(new) - 1
    starts = np.flatnonzero(new)
    fragment, first = owner[starts], place[starts]
    note = note_of[fragment]
    last = place[np.append(starts[1:], len(place)) - 1] + 1 if len(starts) else starts

    note_part = _ints([one.part for one in notes])
    note_key = _ints([one.pitch.key for one in notes])
    part, key = note_part[note], note_key[note]
    # `fragments` are sorted by note, so neighbouring pieces of a note still stand together here.
    same = np.flatnonzero((note[1:] == note[:-1]) & (last[:-1] == first[1:]))
    held = np.stack((same, same + 1), axis=1)
    melodic = _melodic_links(first, last, note, part, key)

    order = np.lexsort((note, key, part, first))
    number = np.empty_like(order)
    number[order] = np.arange(len(order))
    cell_piece = number[piece_of_cell]
    by_slice = np.lexsort((cell_piece, place))
    cell_piece, cell_slice = cell_piece[by_slice], place[by_slice]
    fifths = _ints([one.pitch.pitch_class.fifths for one in notes])[note]
    tuned = np.array([one.tuned for one in score.parts], dtype=bool)[part][order]
    count = len(slices)
    sung = tuned[cell_piece]
    return Layout(
        note=note[order],
        fragment=fragment[order],
        chord=chord_of[fragment][order],
        first=first[order],
        last=last[order],
        part=part[order],
        key=key[order],
        fifths=fifths[order],
        degree=_degrees(harmony)[fragment][order],
        tuned=tuned,
        lone=_lone_pieces(cell_piece, cell_slice, (key % 12)[order], count),
        cell_piece=cell_piece,
        cell_slice=cell_slice,
        quarters=np.array([float(one.duration) for one in slices]),
        voices=np.bincount(cell_slice[sung], minlength=count),
        accompanied=np.bincount(cell_slice[~sung], minlength=count) > 0,
        held=number[held],
        melodic=number[melodic],
    )
