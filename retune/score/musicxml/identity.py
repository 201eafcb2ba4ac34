"""Names of noteheads, for finding them again in the user's file."""

from __future__ import annotations

from retune.adapters.xml import Element


class Identities:
    """Gives every note element of a score one name that no other has.

    It is the element's own `id`, or else "part/bar/note": the part's id, the bar's index in the
    part and the index among all note elements of that bar, both from 0.
    """

    def __init__(self) -> None:
        self._taken: set[str] = set()

    def name(self, element: Element, part: str, bar: int, note: int) -> str:
        """The name of a note element; elements must come in the order of the score's parts."""
        name = element.get("id")
        if name is None or name in self._taken:
            name = f"{part}/{bar}/{note}"
            while name in self._taken:
                name += "'"
        self._taken.add(name)
        return name
