"""The form "table-for-all": a table for a group in which everybody uses it and everybody knows.

What others show means something else once they go by a rule themselves. So the most informative
table is made, the group is played with everybody going by it, every situation is valued anew by
what then happens, and so on until the table no longer changes. Such a table values what is shown
for what it is worth where all use it: it is a fixed point, and no claim is made that there is only
one, or that no other table would serve the group better.
"""

from __future__ import annotations

from dataclasses import replace

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted, table
from thumbwright.distill.rules import Rule
from thumbwright.distill.tallies import Tally
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "table-for-all"

MOST_TURNS = 12
"""So often the group is played anew at most."""

SETTLED, SETTLED_IF_SAMPLED = 1e-9, 0.02
"""Values (nats) that change by no more have settled: exactly, and where histories are sampled."""

Turn = tuple[Rule, Distilled]


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The table of at most ``wanted.rows`` rows that is right where all go by it.

    Raises ModelError where nobody but the rule's agent could use it, or the group cannot be played
    so.
    """
    first = table.distil(pricer, wanted)
    users = pricer.users(first.in_rows)
    if len(users) < 2:
        raise ModelError(
            f'the form "{NAME}" needs others who can use the rule too, and only {pricer.agent} '
            'can; use the form "table"'
        )
    allowed = wanted.max_accuracy_lost
    if allowed is None:
        return _settled(pricer, wanted, first, progress)
    exact = pricer.accuracy(pricer.exact_tally)
    for rows in range(1, wanted.rows + 1):
        narrow = replace(wanted, rows=rows, max_accuracy_lost=None)
        made = _settled(pricer, narrow, table.distil(pricer, narrow), progress)
        together = pricer.together_tally(made.in_rows, pricer.users(made.in_rows))
        if exact - pricer.accuracy(together) <= allowed:
            said = "The fewest rows within the accuracy that may be lost where all use them."
            return replace(made, notes=(*made.notes, said))
    said = f"No table of up to {wanted.rows} rows stays within the accuracy that may be lost."
    return replace(made, notes=(*made.notes, said))


def _settled(
    pricer: Pricer, wanted: Wanted, first: Distilled, progress: Progress | None
) -> Distilled:
    """Play and value anew until nothing changes, or the tables come round again."""
    turns: list[Turn] = [(replace(first.in_rows, form=NAME), first)]
    together = [_together(pricer, turns[0][0])]
    again: int | None = None
    sampled = together[0].sampled is not None
    apart = SETTLED_IF_SAMPLED if sampled else SETTLED
    for number in range(MOST_TURNS):
        if progress:
            progress(NAME, number, MOST_TURNS)
        rule, _ = turns[-1]
        made = table.distil(pricer.with_situations(pricer.situations_among(rule)), wanted)
        new = replace(made.in_rows, form=NAME)
        again = next((k for k, (old, _) in enumerate(turns) if _same(old, new, apart)), None)
        if again is not None:
            break
        turns.append((new, made))
        together.append(_together(pricer, new))
    if progress:
        progress(NAME, MOST_TURNS, MOST_TURNS)
    best = len(turns) - 1
    if again is not None and again == best:
        said = _turns(len(turns) - 1)
        if sampled:
            said += f" Histories were sampled, so values within {apart:g} nats count as the same."
    else:
        # No fixed point was met: of what came up, the best where all use it.
        risks = [pricer.objective(one) for one in together]
        best = risks.index(min(risks))
        said = (
            f"The tables came round again after {len(turns) - again}: there is no fixed point on "
            "this way."
            if again is not None
            else f"After {MOST_TURNS} turns the table still changed."
        ) + " Of all that came up this is the best where all use it."
    rule, made = turns[best]
    return Distilled(
        rule,
        made.information_kept,
        made.information_ceiling,
        (said, _gain(pricer, together[0], together[best]), *made.notes),
    )


def _together(pricer: Pricer, rule: Rule) -> Tally:
    return pricer.together_tally(rule, pricer.users(rule))


def _turns(number: int) -> str:
    if number == 0:
        return "The table for one user is also right where all use it and know."
    times = "once" if number == 1 else f"{number} times"
    return f"Valued anew {times}, by what happens where all use it, until nothing changed."


def _gain(pricer: Pricer, before: Tally, after: Tally) -> str:
    """What valuing anew gains over the table for one user, in everybody's hands."""
    if pricer.losses is None:
        pair = [pricer.accuracy(one) for one in (before, after)]
        return f"Where all use it accuracy is {pair[1]:.6f}, with the table for one {pair[0]:.6f}."
    pair = [one.risk(pricer.losses, pricer.prior_plus) for one in (before, after)]
    return f"Where all use it the risk is {pair[1]:.6f}, with the table for one {pair[0]:.6f}."


def _same(one: Rule, other: Rule, apart: float) -> bool:
    """Whether two tables have the same rows and, but for rounding, the same values."""
    if len(one.rows) != len(other.rows):
        return False
    for first, second in zip(one.rows, other.rows, strict=True):
        if replace(first, value=0.0) != replace(second, value=0.0):
            return False
        assert first.value is not None
        assert second.value is not None
        if first.value != second.value and not abs(first.value - second.value) <= apart:
            return False
    return True
