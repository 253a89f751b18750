"""What pricing rules takes, against the exact solution that it rests on, which is made once."""

from __future__ import annotations

import time
from collections.abc import Callable
from functools import partial

from thumbwright.distill.forms import Wanted, form
from thumbwright.distill.forms.batch import Batch
from thumbwright.distill.forms.moved_lines import LineMoves
from thumbwright.distill.forms.polish import polished
from thumbwright.distill.network_pricer import NetworkPricer
from thumbwright.distill.pricing import pricer_of
from thumbwright.distill.reading import case_from_text, starter_text

Say = Callable[[str, float, str], None]
INPUTS = ("step", "shown")


def _pricer(horizon: int, exchange: str, mutual: bool) -> NetworkPricer:
    text = starter_text("frost-watch").replace("horizon = 40", f"horizon = {horizon}")
    text = text.replace('exchange = "once"', f'exchange = "{exchange}"')
    if mutual:
        text = text.replace("sees = []", 'sees = ["mill"]')
    found, _ = pricer_of(case_from_text(text, name="pair", file="pair.toml"))
    assert isinstance(found, NetworkPricer)
    return found


def _timed(work: Callable[[], object]) -> float:
    begin = time.perf_counter()
    work()
    return time.perf_counter() - begin


def pricing(tiny: bool, best: Callable[[Callable[[], object], int], float], say: Say) -> None:
    """One rule, many rules together, and a polish."""
    horizon = 8 if tiny else 40
    for name, exchange, mutual in (
        ("one-way pair, once", "once", False),
        ("mutual pair, once", "once", True),
        ("mutual pair, settle", "settle", True),
    ):
        solving = best(partial(_pricer, horizon, exchange, mutual), 2)
        say(f"{name}: exact beliefs", solving, "")
        pricer = _pricer(horizon, exchange, mutual)
        for made in (form(f).distil(pricer, Wanted(4, INPUTS)) for f in ("lines", "table")):
            price = partial(pricer.rule_tally, made.rule)
            first, again = _timed(price), best(price, 20)
            ratio = f"first {first:.4f} s; beliefs / price = {solving / again:.1f}"
            say(f"{name}: price of one {made.rule.form}", again, ratio)
        lines = form("lines").distil(pricer, Wanted(4, INPUTS)).rule
        moves = LineMoves(pricer, INPUTS, lines)
        again = best(partial(moves.tallies, [moves.start]), 20)
        say(
            f"{name}: lines, off-model not counted",
            again,
            f"beliefs / price = {solving / again:.1f}",
        )
    pricer = _pricer(horizon, "once", False)
    made = form("lines").distil(pricer, Wanted(4, INPUTS))
    moves = LineMoves(pricer, INPUTS, made.rule)
    many = list(moves.moves(moves.start)) * (1 if tiny else 50)
    alone = best(lambda: pricer.rule_tally(made.rule), 5)
    together = best(lambda: Batch(pricer).tallies(many), 3) / len(many)
    say(
        f"one of {len(many)} priced together",
        together,
        f"alone / together = {alone / together:.1f}",
    )
    wanted = Wanted(4, INPUTS, polish=True)
    say("polish of the lines", best(lambda: polished(pricer, wanted, made), 2), "")
