"""Putting situations to the look-up of a sheet, through its own fields, in a browser."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from tests.browser import Browser

_ASK = """
(function (asked) {
  var data = JSON.parse(document.getElementById("lookup-data").textContent);
  var fields = Array.from(document.querySelectorAll("#lookup .ask"));
  var shown = data.asks.filter(function (ask) { return ask.kind !== "count"; });
  var own = document.getElementById("own"), box = document.getElementById("lookup-said");
  return asked.map(function (one) {
    shown.forEach(function (ask, place) {
      var field = fields[place], given = one.given[ask.key];
      if (given === undefined) { field.value = field.defaultValue || "0"; return; }
      field.value = String(ask.kind === "choice" ? ask.names.indexOf(given) : given);
    });
    own.value = one.tally;
    own.dispatchEvent(new Event("input"));
    return {
      act: box.dataset.act, row: box.dataset.row, worth: box.dataset.worth, stood: own.value,
      said: document.getElementById("act").textContent,
      line: document.getElementById("line").textContent
    };
  });
}(%s))
"""


def ask(
    browser: Browser,
    page: str,
    folder: Path,
    asked: Sequence[tuple[float | str, Mapping[str, Any]]],
) -> list[dict[str, str]]:
    """Set every field for each (own tally, what else is given) and return what stands there.

    Each answer has ``act`` ("plus", "minus", "watch", "open", "none"), ``row`` and ``worth`` (""
    for none), ``stood`` (where the peg came to stand) and the words shown.
    """
    place = folder / "asked.html"
    place.write_text(page, encoding="utf-8")
    browser.open(place)
    situations = [
        {"tally": tally if isinstance(tally, str) else repr(tally), "given": dict(given)}
        for tally, given in asked
    ]
    found: list[dict[str, str]] = browser.ask(_ASK % json.dumps(situations))
    return found
