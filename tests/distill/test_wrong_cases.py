"""Every way of getting a case wrong gives one plain message that points to its line."""

from __future__ import annotations

import re

import pytest

from thumbwright.distill.faults import Faults
from thumbwright.distill.reading import case_from_text, starter_text

FROST = starter_text("frost-watch")
LOT = starter_text("lot-inspection")


def faults_of(text: str) -> list[str]:
    with pytest.raises(Faults) as caught:
        case_from_text(text, name="t", file="t.toml")
    return list(caught.value.messages)


def frost(*changes: tuple[str, str]) -> str:
    return changed(FROST, *changes)


def changed(text: str, *changes: tuple[str, str]) -> str:
    for old, new in changes:
        assert old in text
        text = text.replace(old, new, 1)
    return text


def line_with(text: str, part: str) -> int:
    return text[: text.index(part)].count("\n") + 1


# (what is changed in frost-watch, where the fault must point, what it must say)
WRONG = {
    # the ten ways that a user is most likely to go wrong (the file-level ones are further below)
    "missing section": ("[time]", "[tyme]", "[tyme]", "tyme: is an unknown section"),
    "misspelt key": ("stakes =", "steaks =", "steaks", "question.steaks: is an unknown key"),
    "probability above 1": ("p = 0.6", "p = 1.6", "p = 1.6", "allowed from 0 to 1"),
    "wrong way round": (
        "plus = 3",
        "plus = -5",
        "minus = -3",
        "even.minus: -3 lies above plus, -5",
    ),
    "equal": ("plus = 3", "plus = -3", "minus = -3", "even.minus: equals plus, -3"),
    "unknown thresholds": ('"even"\nsees', '"evn"\nsees', '"evn"', "did you mean even"),
    "sees itself": ('["upper"]', '["mill"]', '["mill"]', "sees[1]: an agent cannot see itself"),
    "horizon 0": ("horizon = 40", "horizon = 0", "horizon", "a whole number from 1 to 1000"),
    "rule for nobody": ('agent = "mill"', 'agent = "mil"', '"mil"', "for nobody (allowed any,"),
    # texts
    "text as number": ('"frost tonight"', "3", "plus = 3", "question.plus: must be text in quotes"),
    "empty text": ('"frost tonight"', '" "', 'plus = " "', "must not be empty"),
    "control character": ('"check"', '"a\\u001bb"', '"a\\u', "control character (U+001B)"),
    "two lines": ('"check"', '"""a\nb"""', 'check = "', "control character (U+000A)"),
    "right to left": ('"check"', '"a\\u202eb"', '"a\\u', "control character (U+202E)"),
    "long text": ('"check"', f'"{"x" * 201}"', "xxx", "has 201 characters (allowed at most 200)"),
    "same answers": ('"no frost tonight"', '"frost tonight"', "minus =", "the same as plus"),
    "same states": ('"lamp dark"', '"lamp lit"', "shows_nothing", "the same as shows_plus"),
    "same names": ('"Mill field"', '"Upper field"', '"Upper field"\nthresholds = "even"', "differ"),
    # when an agent observes
    "late": (
        'sees = ["upper"]',
        'sees = ["upper"]\nfirst_step = 41',
        "first_step",
        "first_step: 41 lies after the last step, 40",
    ),
    "never": ("sees = []", "sees = []\nlooks_every = 0", "looks_every", "whole number from 1 to"),
    "half a look": ("sees = []", "sees = []\nlooks_per_step = 1.5", "looks_per", "not 1.5"),
    "misspelt look": ("sees = []", "sees = []\nlooks_evry = 2", "evry", "mean looks_every"),
    # numbers
    "number as text": ("p = 0.6", 'p = "0.6"', 'p = "0.6"', "write it without quotes"),
    "true as number": ("p = 0.6", "p = true", "p = true", "must be a number, not true"),
    "not a number": ("p = 0.6", "p = nan", "p = nan", "must be a finite number"),
    "infinite": ("plus = 3", "plus = inf", "plus = inf", "must be a finite number"),
    "huge": ("plus = 3", f"plus = {10**400}", "plus = 1000", "not a very large number"),
    "half a step": ("horizon = 40", "horizon = 4.5", "horizon", "must be a whole number, not 4.5"),
    "rows": ("rows = 6", "rows = 61", "rows", "from 1 to 60"),
    "certain prior": ("prior_plus = 0.5", "prior_plus = 1", "prior_plus", "less than 1"),
    # evidence
    "unknown kind": ('"coin"', '"cion"', "[evidence]", "did you mean coin"),
    "kind missing": ('kind = "coin" ', "# ", "[evidence]", "its kind is missing (allowed coin,"),
    "wrong signs": (
        "p = 0.6",
        "p = 0.4",
        "p = 0.4",
        "swap what counts as plus_sign and minus_sign",
    ),
    "no information": ("p = 0.6", "p = 0.5", "p = 0.5", "carries no information"),
    "certain": ("p = 0.6", "p = 1", "p = 1", "a single sign is certain"),
    # thresholds
    "fraction of a sign": ("plus = 3", "plus = 2.5", "plus = 2.5", "allowed whole numbers"),
    "unit missing": ('unit = "observations"', "", "[thresholds.even]", "even.unit: is missing (al"),
    "unit misspelt": ('"observations"', '"nat"', '"nat"', "did you mean nats"),
    "two ways": ("plus = 3", "plus = 3\nfalse_plus = 0.1", "[thresholds.even]", "in two ways"),
    "not a probability": (
        'unit = "observations"',
        'unit = "probability"',
        "plus = 3",
        "more than 0",
    ),
    "says nothing": (
        "[thresholds.even]",
        "[thresholds.x]\n[thresholds.even]",
        "[thresholds.x]",
        "not",
    ),
    "reserved": (
        "[thresholds.even]",
        "[thresholds.unknown]",
        "[thresholds.unknown]",
        "another name",
    ),
    # the group
    "unknown agent": ('["upper"]', '["uper"]', '["uper"]', "did you mean upper"),
    "sees twice": (
        '["upper"]',
        '["upper", "upper"]',
        '["upper"',
        'sees[2]: "upper" is listed twice',
    ),
    "sees no list": ('["upper"]', '"upper"', 'sees = "upper"', "must be a list in [ ]"),
    "no thresholds": ('thresholds = "even"', "", "[agents.mill]", "mill.thresholds: is missing"),
    "shares": (
        'thresholds = "even"',
        "unknown = { even = 0.7, quick-to-stand-down = 0.2 }",
        "unknown =",
        "the shares sum to 0.9",
    ),
    "share": ('thresholds = "even"', "unknown = { even = 1.5 }", "unknown =", 'share of "even"'),
    "shares of unknown": ('thresholds = "even"', "unknown = { evn = 1 }", "unknown =", "mean even"),
    "both": (
        'thresholds = "even"',
        'thresholds = "even"\nunknown = { even = 1 }',
        "unknown",
        "both",
    ),
    "bad id": (
        "[agents.mill]",
        '[agents."the mill"]',
        '[agents."the mill"]',
        "cannot name a column",
    ),
    "long id": ("[agents.mill]", f"[agents.{'m' * 41}]", "[agents.mm", "at most 40"),
    "digit first": ("[agents.mill]", "[agents.1mill]", "[agents.1mill]", "a letter first"),
    "any": ("[agents.mill]", "[agents.any]", "[agents.any]", "has a meaning of its own"),
    "collision": (
        "[agents.mill]",
        '[agents.a-b]\nthresholds = "even"\n[agents.a_b]\nthresholds = "even"\n[agents.mill]',
        "[agents.a_b]",
        'is the same name as "a-b"',
    ),
    # the rule
    "sees nobody": ('agent = "mill"', 'agent = "upper"', 'agent = "upper"', "sees nobody"),
    "nobody sees": ('["upper"] ', "[] #", '"mill"   ', '"mill" sees nobody'),
    "unknown form": ('"table"]', '"tabel"]', '"tabel"]', 'forms[2]: "tabel" is not known here'),
    "form of later": (
        '"table"]',
        '"web"]',
        '"web"]',
        "(allowed lines, table, table-by-risk, table-for-all, tree, shifts, formula)",
    ),
    "form twice": ('"table"]', '"lines"]', '"lines"]', "listed twice"),
    "no forms": (
        '["lines", "table"]',
        "[]",
        "forms = []",
        "too short a list (allowed 1 entry or more)",
    ),
    "unknown input": ('"shown"]', '"show"]', '"show"]', "did you mean shown"),
    "no covers": ('"shown"]', '"thresholds"]', "[rule]", "covers: needs two or more names"),
    "covers": ("rows = 6", 'covers = ["even"]', "covers", "used only where inputs"),
    "covers unknown": (
        'inputs = ["step", "shown"]',
        'inputs = ["thresholds"]\ncovers = ["even", "quick"]',
        "covers",
        'no thresholds "quick"',
    ),
    # costs
    "free errors": ("false_plus = 1.0", "false_plus = 0", "false_plus = 0", "allowed more than 0"),
    "gain by waiting": ("per_step = 0.015", "per_step = -1", "per_step", "allowed 0 or more"),
    "free waiting": (
        "per_step = 0.015",
        'per_step = 0\n[thresholds.best]\nfrom = "costs"',
        "per_step = 0",
        "would never stop",
    ),
}


@pytest.mark.parametrize("way", WRONG)
def test_each_fault_names_its_line_and_what_is_wrong(way: str) -> None:
    old, new, where, says = WRONG[way]
    text = frost((old, new))
    found = faults_of(text)
    line = line_with(text, where)
    assert any(message.startswith(f"t.toml:{line}: ") and says in message for message in found), (
        line,
        found,
    )
    # One slip, one message; a wrong id or a lost agent may also be missed elsewhere.
    assert len(found) <= 3, found
    for message in found:
        assert re.match(r"t\.toml:[1-9][0-9]*: ", message)
        assert not re.search(r"pydantic|Input should|value_error|type=|validat", message)


def test_a_misspelt_key_is_not_also_reported_as_missing() -> None:
    assert len(faults_of(frost(("stakes =", "steaks =")))) == 1
    assert len(faults_of(frost(("\nunit =", "\nunits =")))) == 1
    assert len(faults_of(frost(('thresholds = "even"', 'treshold = "even"')))) == 1


def test_all_faults_come_at_once_in_the_order_of_lines() -> None:
    changes = [
        (old, new)
        for old, new, _, _ in (
            WRONG[way]
            for way in (
                "misspelt key",
                "horizon 0",
                "equal",
                "sees itself",
                "rule for nobody",
                "gain by waiting",
                "unknown form",
                "probability above 1",
            )
        )
    ]
    found = faults_of(frost(*changes))
    lines = [int(message.split(":")[1]) for message in found]
    assert len(found) == len(changes)
    assert lines == sorted(lines)
    assert len(set(lines)) == len(changes)


def test_checks_between_sections_run_beside_other_faults_in_the_same_table() -> None:
    text = frost(
        ('sees = ["upper"]', 'sees = ["mill"]\ncolour = 1'),
        ('agent = "mill"', 'agent = "x"\nform = 1'),
    )
    found = "\n".join(faults_of(text))
    for part in ("cannot see itself", "mill.colour: is an unknown key", "for nobody", "mean forms"):
        assert part in found


@pytest.mark.parametrize("section", ["question", "evidence", "time", "rule"])
def test_a_missing_section_is_named(section: str) -> None:
    text = re.sub(rf"(?ms)^\[{section}\].*?(?=^\[)", "", FROST)
    assert f"t.toml:1: {section}: the section [{section}] is missing" in faults_of(text)


def test_a_case_without_group_or_thresholds_is_told_so() -> None:
    found = "\n".join(faults_of(re.sub(r"(?ms)^\[(agents|thresholds)\..*?(?=^\[)", "", FROST)))
    assert "t.toml:1: agents: the group is missing: write [agents.ID] tables, or [network]" in found
    assert "t.toml:1: thresholds: the section [thresholds.NAME] is missing" in found


LOT_WRONG = {
    "rates": ("false_plus = 0.05", "false_plus = 0.9", "false_minus", "sum to 1 (allowed less"),
    "unit": (
        "false_plus = 0.05",
        'plus = 2\nminus = -2\nunit = "observations" #',
        "unit =",
        '"observations" needs coin evidence, but the evidence is "bernoulli"',
    ),
    "no costs": (
        "[thresholds.plan]",
        '[thresholds.x]\nfrom = "costs"\n[thresholds.plan]',
        'from = "costs"',
        "[costs]",
    ),
    "missing key": ("p_minus = 0.01 ", "# ", "[evidence]", "evidence.p_minus: is missing"),
    "lengths": (
        'kind = "bernoulli"  ',
        'kind = "listed"\nplus = [0.5, 0.5]\nminus = [0.2, 0.3, 0.5] #',
        "minus = [",
        "has 3 values where plus has 2",
    ),
    "sum": (
        'kind = "bernoulli"  ',
        'kind = "listed"\nplus = [0.5, 0.4]\nminus = [0.5, 0.5] #',
        "plus = [",
        "sums to 0.9 (allowed a sum of 1)",
    ),
    "never": (
        'kind = "bernoulli"  ',
        'kind = "listed"\nplus = [0.5, 0.5,\n 0]\nminus = [0.4, 0.6, 0] #',
        " 0]\nminus",
        "value 3 has probability 0 under both answers",
    ),
    "values": (
        'kind = "bernoulli"  ',
        'kind = "listed"\nvalues = ["a", "a", "b"]\nplus = [0.5, 0.5]\nminus = [0.5, 0.5] #',
        "values",
        "names 3 values where plus has 2",
    ),
    "counts": (
        'kind = "bernoulli"  ',
        'kind = "calibration"\nhits = 0\nmisses = 0\nfalse_alarms = 1\ncorrect_rejections = 1 #',
        "hits",
        "hits and misses are both 0",
    ),
    "negative count": (
        'kind = "bernoulli"  ',
        'kind = "calibration"\nhits = -1 #',
        "hits",
        "from 0",
    ),
}


@pytest.mark.parametrize("way", LOT_WRONG)
def test_faults_of_evidence_and_error_rates(way: str) -> None:
    old, new, where, says = LOT_WRONG[way]
    text = changed(LOT, (old, new))
    # What is replaced may name the same keys further up, in a comment.
    line = (
        line_with(text, new) + line_with(new, where) - 1 if where in new else line_with(text, where)
    )
    start = f"t.toml:{line}: "
    found = faults_of(text)
    assert any(m.startswith(start) and says in m for m in found), (start, found)


def test_evidence_of_one_agent_is_checked_where_it_stands() -> None:
    text = frost(
        ('sees = ["upper"]', 'sees = ["upper"]\n[agents.mill.evidence]\nkind = "normal"\nd = 0')
    )
    found = faults_of(text)
    assert any(
        "agents.mill.evidence.d: 0 is out of range (allowed more than 0)" in m for m in found
    )
    # mill's thresholds count observations, which its own evidence has none of
    assert any('evidence of agent "mill" is "normal"' in m for m in found)
    assert not any("quick-to-stand-down" in m for m in found)


NETWORK = re.sub(r"(?ms)^\[agents\..*?(?=^\[rule)", "", FROST).replace('"mill" ', '"any" ')


@pytest.mark.parametrize(
    ("keys", "says"),
    [
        ('shape = "rng"\nsize = 3\nthresholds = "even"', "did you mean ring"),
        ('shape = "ring"\nthresholds = "even"', "network.size: is missing: a ring needs"),
        ('shape = "ring"\nsize = 2\nthresholds = "even"', "do not form a ring (allowed 3 or more)"),
        ('shape = "mutual"\nsize = 3\nthresholds = "even"', "do not form a mutual (allowed 2)"),
        ('shape = "crowd"\nsize = 1001\nthresholds = "even"', "from 2 to 1000"),
        ('shape = "crowd"\nsize = 3\nthresholds = "evn"', "did you mean even"),
        ('shape = "crowd"\nsize = 3', "network.thresholds: is missing"),
        ('shape = "mutual"\nthresholds = "even"\nnames = ["A"]', "has 1 names for 2 agents"),
        ('shape = "mutual"\nthresholds = "even"\nnames = ["A", "A"]', "names two agents"),
        (
            'file = "e.csv"\nthresholds = "even"',
            '"e.csv" cannot be read: this case is in no folder',
        ),
        ('file = "e.xls"\nthresholds = "even"', "(allowed names ending in .csv or .graphml)"),
        ('file = "e.csv"\nshape = "mutual"\nthresholds = "even"', "both given; keep one"),
        ('file = 3\nthresholds = "even"', "network.file: must be text in quotes"),
        ('thresholds = "even"', "network.shape: is missing (allowed one-way, mutual, relay, ring"),
        ('shape = "mutual"\nthresholds = "even"\n[agents.a]\nthresholds = "even"', "stated twice"),
    ],
)
def test_faults_of_a_network(keys: str, says: str) -> None:
    case_from_text(NETWORK + '[network]\nshape = "mutual"\nthresholds = "even"\n', "t", "t.toml")
    found = faults_of(NETWORK + f"[network]\n{keys}\n")
    assert any(says in message for message in found), found
    assert len(found) == 1, found


def test_the_rule_of_a_network_must_be_for_one_of_its_agents() -> None:
    text = NETWORK.replace('agent = "any"', 'agent = "a3"')
    found = faults_of(text + '[network]\nshape = "one-way"\nthresholds = "even"\n')
    assert len(found) == 1
    assert 'no agent "a3", so the rule is for nobody (allowed any, a1, a2)' in found[0]


def test_nobody_sees_anybody() -> None:
    text = frost(('["upper"] ', "[] #"), ('agent = "mill"', 'agent = "any"'))
    assert "nobody in this group sees anybody" in faults_of(text)[0]


def test_thresholds_that_are_met_must_be_covered() -> None:
    extra = '[thresholds.slow]\nplus = 5\nminus = -5\nunit = "observations"\n[agents.upper]'
    text = frost(
        ('"shown"]', '"shown", "thresholds"]\ncovers = ["even", "slow"]'), ("[agents.upper]", extra)
    )
    assert 'leaves out "quick-to-stand-down", which agent "upper" has' in faults_of(text)[0]
    covered = text.replace('["even", "slow"]', '["even", "quick-to-stand-down"]')
    assert case_from_text(covered, "t", "t.toml").rule.covers == ["even", "quick-to-stand-down"]


def test_a_wording_that_equals_a_default_is_found() -> None:
    text = frost(("shows_nothing =", "# "), ('"lamp lit"', '"no answer yet"'))
    found = faults_of(text)
    assert len(found) == 1
    assert "words.shows_nothing: says the same as shows_plus" in found[0]
