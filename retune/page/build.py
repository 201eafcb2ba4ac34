"""The page put together: one HTML file with its style, script, score and piece inside.

Nothing is loaded from anywhere: the content-security policy names the style and the script by
their SHA-256 and forbids all else. Text of the score is escaped wherever it stands.
"""

from __future__ import annotations

import base64
import gzip
import hashlib
import json
from collections.abc import Mapping, Sequence
from html import escape
from importlib.resources import files
from string import Template
from typing import Any

_ASSETS = files("retune.page").joinpath("assets")
_SCRIPTS = ("sound.js", "score.js", "choose.js", "card.js", "advice.js", "drift.js", "main.js")

LEGEND = (
    "Small numbers at the notes: cents by which the note lies above (+) or below (\u2212) where a "
    "piano has it, counted from the root of its chord; a major third has \u221214. Below each "
    "system stand the chords; a question mark says that the root is in doubt."
)
GRID_LEGEND = (
    "Each row is a chord. Numbers: cents by which the note lies above (+) or below (\u2212) where "
    "a piano has it, counted from the root; a question mark says that the root is in doubt."
)


def page(
    data: Mapping[str, Any],
    score: str,
    packed: Mapping[str, Sequence[str]],
    words: Mapping[str, str],
    part: str = "",
) -> bytes:
    """The page as UTF-8.

    Parameters
    ----------
    data : mapping
        The piece, see `page_data`.
    score : str
        Markup of the plain score: systems or a grid.
    packed : mapping
        Systems of other engravings as SVG texts by name; compressed, for the script alone.
    words : mapping
        Plain text: byline, policy, notice, legend, listening, voice, reading.
    part : str
        Name of the part that is chosen when the page opens; "" for none.
    """
    style = _ASSETS.joinpath("page.css").read_text("utf-8")
    script = '"use strict";\n' + "\n".join(
        _ASSETS.joinpath(name).read_text("utf-8") for name in _SCRIPTS
    )
    policy = "; ".join(
        (
            "default-src 'none'",
            f"script-src '{_digest(script)}'",
            f"style-src '{_digest(style)}'",
            "base-uri 'none'",
            "form-action 'none'",
        )
    )
    title = str(data["title"]) + (f" \u2013 {part}" if part else "")
    notice = f'<p class="notice">{escape(words["notice"])}</p>' if words["notice"] else ""
    text = Template(_ASSETS.joinpath("page.html").read_text("utf-8")).substitute(
        part=f' data-part="{escape(part)}"' if part else "",
        policy=policy,
        title=escape(title),
        style=style,
        byline=escape(words["byline"]),
        policy_words=escape(words["policy"]),
        notices=notice,
        score=score,
        legend=escape(words["legend"]),
        listening=escape(words["listening"]),
        voice=escape(words["voice"]),
        reading=escape(words["reading"]),
        piece=script_json(data),
        packed="\n".join(_packed(name, systems) for name, systems in packed.items()),
        script=script,
    )
    return text.encode("utf-8")


def systems_markup(systems: Sequence[str]) -> str:
    """Systems as boxes, as the script makes them too."""
    return "\n".join(f'<div class="system">{system}</div>' for system in systems)


def script_json(value: Any) -> str:
    """JSON that no text in it can end the element around it.

    >>> script_json("</script>")
    '"\\\\u003c/script>"'
    """
    text = json.dumps(value, ensure_ascii=False, separators=(",", ":"))
    for char in "<\u2028\u2029":
        text = text.replace(char, f"\\u{ord(char):04x}")
    return text


def _digest(text: str) -> str:
    """As a content-security policy names an inline style or script."""
    found = hashlib.sha256(text.encode("utf-8")).digest()
    return f"sha256-{base64.b64encode(found).decode('ascii')}"


def _packed(name: str, systems: Sequence[str]) -> str:
    data = gzip.compress(json.dumps(list(systems)).encode("utf-8"), 9, mtime=0)
    body = base64.b64encode(data).decode("ascii")
    return f'<script type="text/plain" data-engraving="{escape(name)}">{body}</script>'
