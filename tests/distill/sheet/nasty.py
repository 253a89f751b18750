"""Labels that would do something if they were ever taken for more than text."""

from __future__ import annotations

from typing import Any

from hypothesis import strategies as st

from tests.distill.sheet import sample_findings as samples

LABELS = (
    '"><script>window.hit = 1</script><img src=x onerror="window.hit = 1">',
    "</script><script>window.hit = 1</script>",
    "</SCRIPT ><svg/onload=window.hit=1>",
    "<!--<script>",
    "--><b>x",
    "]]></svg><![CDATA[",
    "</style><style>*{display:none}</style>",
    "</title></textarea><iframe srcdoc='<script>parent.hit=1</script>'>",
    "' onfocus=window.hit=1 autofocus x='",
    "javascript:window.hit=1",
    "{{ 7*7 }}{% raw %}{# #}",
    "{{ ''.__class__.__mro__ }}",
    "&lt;b&gt; &amp; &#60;script&#62; &nbsp",
    "\\u003cscript\\u003e \\x3c \\",
    "[a](http://x.example) ![b](http://x.example/y.png)",
    "<http://x.example> www.x.example http://x.example a@x.example",
    "| a | b |",
    "```js",
    "~~~",
    "`code` *star* _under_ ~~gone~~ $x$",
    "# heading",
    "- item",
    "1. item",
    "> quote",
    "===",
    "---",
    "[ ] box",
    "[ref]: http://x.example",
    "=HYPERLINK(A1)",
    "+1+1",
    "@SUM(A1)",
    "__proto__",
    "constructor",
    "שלום עליכם",
    "मौसम की जाँच",
    "🌡️ cold",
    "…" * 40,
    "W" * 190,
)
"""All of them texts that a case may hold."""

REFUSED = (
    "a\u2028b",
    "a\u2029b",
    "a\0b",
    "a\x1b[31mb",
    "a\nb",
    "a\u202eb",
    "a\u2066b",
    "a\x85b",
    "a\ud800b",
)
"""Texts that no case may hold; a sheet would clean them all the same."""

PIECES = st.sampled_from(
    [
        *LABELS[:31],
        "<",
        ">",
        '"',
        "'",
        "&",
        "`",
        "\\",
        "|",
        "*",
        "_",
        "[",
        "]",
        "(",
        ")",
        "!",
        "#",
        " ",
        "word",
        "=",
        ":",
        "://",
        "$",
        "~",
        "{",
        "}",
        "\u00a0",
        "\u200d",
        "\ufeff",
    ]
)
texts = (
    st.lists(PIECES | st.text(max_size=4), min_size=1, max_size=6)
    .map(lambda parts: "".join(parts)[:200])
    .filter(lambda text: text.strip() != "")
)


def case_of(label: str) -> dict[str, Any]:
    """Changes to the sample case that put a label into every text of it, each told apart."""

    def told(what: str) -> str:
        return f"{label} {what}"[-200:]

    return {
        "title": told("title"),
        "words": {key: told(key.replace("_", " ")) for key in samples.FROST["words"]},
        "agents": {
            "upper": {"name": told("upper"), "thresholds": "even", "sees": []},
            "mill": {"name": told("mill"), "thresholds": "even", "sees": ["upper"]},
        },
        "question": samples.FROST["question"] | {"plus": told("yes"), "minus": told("no")},
        "time": {"horizon": 40, "step_label": told("long")},
    }
