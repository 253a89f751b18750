"""The form "table-by-risk": the table of least risk, to stand beside the most informative one.

Information ranks tables; it does not decide. With costs known, boxes and values are chosen under
exact pricing, starting from the most informative tables, so that the result is never worse than the
most informative table of as many rows. The search is by single steps: it finds no guaranteed
optimum.
"""

from __future__ import annotations

from thumbwright.distill.costs import Pricer
from thumbwright.distill.forms import Distilled, Wanted
from thumbwright.distill.forms.boxes import gain
from thumbwright.distill.forms.choosing import box_masses
from thumbwright.distill.forms.enough import Enough
from thumbwright.distill.forms.grouping import best_groupings
from thumbwright.distill.forms.risk_search import Search
from thumbwright.distill.forms.table import print_order, refuse_too_large
from thumbwright.distill.forms.valued import Bench, Valued
from thumbwright.exact.engine import Progress
from thumbwright.exact.errors import ModelError

NAME = "table-by-risk"


def distil(pricer: Pricer, wanted: Wanted, progress: Progress | None = None) -> Distilled:
    """The table of at most ``wanted.rows`` rows and, as far as the search finds, least risk.

    Raises ModelError where no costs are known, or the grid of inputs is too large.
    """
    if pricer.losses is None:
        raise ModelError(
            f'the form "{NAME}" needs costs, and none are stated or could be inferred; state '
            'them under [costs], or use the form "table"'
        )
    bench = Bench(pricer, wanted.inputs, NAME)
    refuse_too_large(bench.axes, wanted.rows, NAME)
    search = Search(bench, wanted.rows, progress)
    notes: list[str] = []
    if not wanted.limited:
        _, found = search.best(wanted.rows)
    else:
        found, notes = _fewest(pricer, wanted, bench, search)
    informative = search.most_informative(len(found.boxes))
    notes += _beside(pricer, bench, found, informative)
    pairs = zip(found.boxes, found.values, strict=True)
    ordered = sorted(pairs, key=lambda pair: print_order(bench.axes, pair[0]))
    boxes, values = zip(*ordered, strict=True)
    situations = pricer.situations
    kept = float(gain(*box_masses(pricer, bench.axes, boxes)).sum())
    ceiling = best_groupings(situations.plus, situations.minus, len(boxes))
    return Distilled(
        bench.rule(Valued(boxes, values)),
        situations.information_kept(kept),
        situations.information_kept(float(ceiling[-1])),
        tuple(notes),
    )


def _fewest(
    pricer: Pricer, wanted: Wanted, bench: Bench, search: Search
) -> tuple[Valued, list[str]]:
    """The fewest rows found within the limits of the case."""
    enough = Enough(pricer, wanted)
    for rows in range(1, wanted.rows + 1):
        _, found = search.best(rows)
        if enough(bench.tallies([found])[0]):
            said = [f"The fewest rows found that {enough.they}."] if enough.they else []
            return found, [*said, *enough.notes]
    return found, [
        f"No table of up to {wanted.rows} rows was found that {enough.it}; this is the one of "
        "least risk."
    ]


def _beside(pricer: Pricer, bench: Bench, found: Valued, informative: Valued) -> list[str]:
    """What was gained over the most informative table of as many rows."""
    assert pricer.losses is not None
    ours, theirs = bench.tallies([found, informative])
    risks = [one.risk(pricer.losses, pricer.prior_plus) for one in (ours, theirs)]
    kept = [pricer.benefit_kept(one, pricer.losses) for one in (ours, theirs)]
    shares = "" if None in kept else f" (benefit kept {kept[0]:.4f} against {kept[1]:.4f})"
    return [
        f"Boxes and values chosen by exact risk among {bench.priced:,} tables: {risks[0]:.6f} "
        f"against {risks[1]:.6f} for the most informative table of as many rows{shares}.",
        "A value stands for all that lead to the same acts; it is not the mean of exact worths.",
    ]
