"""The command line: each verb translates its words into one library call and prints the answer.

Nothing heavy is imported at the top: a verb imports what it needs when it runs, so that
``--help`` answers at once. No traceback reaches a user; exit status is 0 when done, 2 when
what was asked cannot be done as it stands (with the reasons), 1 when the machine could not do
it (no room, no right to write), 130 when stopped by the user.
"""

from __future__ import annotations

import os
import signal
import sys
from collections.abc import Callable, Sequence
from functools import wraps
from pathlib import Path
from types import FrameType
from typing import TYPE_CHECKING, Any, NoReturn

import click

if TYPE_CHECKING:
    from thumbwright.distill.assemble import Limits

CASE = click.argument("case", metavar="CASE")
_LIMITS = (
    click.option(
        "--drop",
        type=click.FloatRange(0.0, 0.01),
        default=0.0,
        metavar="P",
        help="Leave out what is shown with a probability below P; what that can change is printed.",
    ),
    click.option(
        "--memory",
        type=click.FloatRange(0.001),
        metavar="GB",
        help="Memory a run may take; left out: half of what is free.",
    ),
    click.option(
        "--histories",
        type=click.IntRange(4),
        metavar="N",
        help="Sample N public histories of a crowd (an even number); left out: enumerate them, or "
        "sample 4000 where they are too many.",
    ),
    click.option(
        "--seed",
        type=click.IntRange(0),
        default=1,
        metavar="N",
        help="With which to sample; the same seed gives the same figures (1 where left out).",
    ),
)


def limited(verb: Callable[..., None]) -> Callable[..., None]:
    """Give a verb the options that limit a run, handed to it together as ``limits``."""

    @wraps(verb)
    def with_limits(
        drop: float, memory: float | None, histories: int | None, seed: int, **others: Any
    ) -> None:
        from thumbwright.distill.assemble import Limits

        size = None if memory is None else memory * 1e9
        verb(limits=Limits(drop, size, histories, seed), **others)

    for option in reversed(_LIMITS):
        with_limits = option(with_limits)
    return with_limits


JSON = click.option("--json", "as_json", is_flag=True, help="Print all figures as JSON.")
TRACE = "THUMBWRIGHT_TRACE"
"""Environment variable: when set, a fault of the program itself is shown in full."""

_STOPPED = 130
"""Exit status when stopped by the user."""

_TOO_LARGE = (
    "this case needs more memory than there is: shorten the horizon, let agents see fewer others,"
    " or split the group"
)


def _print_version(context: click.Context, _option: click.Parameter, asked: bool) -> None:
    if asked and not context.resilient_parsing:
        from importlib.metadata import version

        click.echo(f"thumbwright {version('thumbwright')}")
        context.exit()


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 96})
@click.option(
    "--version",
    is_flag=True,
    is_eager=True,
    expose_value=False,
    callback=_print_version,
    help="Print the version and end.",
)
def verbs() -> None:
    """Put what watching others is worth into a rule that fits on a card, and say what it costs.

    CASE is a case file, or the name of a starter; "thumbwright starter" lists the starters.
    """


@verbs.command()
@click.argument("name", required=False)
@click.argument("file", required=False, type=click.Path(path_type=Path))
def starter(name: str | None, file: Path | None) -> None:
    """Write a starter case file to begin from; list the starters when none is named.

    FILE is NAME.toml in this folder where it is not given. A file that exists is left alone.
    """
    from thumbwright.distill import starters

    if name is None:
        click.echo(starters.listing())
        return
    written = starters.write_starter(name, file or Path(f"{name}.toml"))
    click.echo(f"Wrote {written}. Next: thumbwright sheet {written}")


@verbs.command()
@click.argument("case", metavar="CASE", required=False)
@limited
@click.option("--schema", is_flag=True, help="Print the JSON Schema of case files, for editors.")
def check(case: str | None, limits: Limits, schema: bool) -> None:
    """Look through a case: every fault at once, or what will be computed and how long it takes."""
    if schema:
        from thumbwright.distill.case import Case

        _show(_as_json(Case.json_schema()))
        return
    if case is None:
        raise click.UsageError("Name a CASE to check, or give --schema.")
    from thumbwright.distill import job
    from thumbwright.distill.reading import read_case

    _show(job.check(read_case(case), limits))


@verbs.command()
@CASE
@click.option(
    "--into",
    type=click.Path(path_type=Path, file_okay=False),
    metavar="DIR",
    help="Folder to write into, made where it is missing; otherwise outputs/<name of the case>.",
)
@click.option(
    "--templates",
    type=click.Path(path_type=Path, file_okay=False, exists=True),
    metavar="DIR",
    help="Folder of templates of your own; each stands in for ours of the same name.",
)
@click.option("--pdf", is_flag=True, help="Write the sheet as PDF too (needs the extra pdf).")
@limited
def sheet(case: str, into: Path | None, templates: Path | None, pdf: bool, limits: Limits) -> None:
    """The main job: exact beliefs, rules, their costs; writes the policy sheet and its data."""
    from thumbwright.distill import job
    from thumbwright.distill.progress import progress_on_terminal
    from thumbwright.distill.reading import read_case

    read = read_case(case)
    with progress_on_terminal() as progress:
        folder = into or Path("outputs") / read.name
        summary = job.sheet(read, folder, progress, limits, templates, pdf)
    _show(summary)


@verbs.command()
@CASE
@click.option(
    "--csv",
    "file",
    type=click.Path(path_type=Path, dir_okay=False),
    metavar="FILE",
    help="Write the table to FILE instead of printing it.",
)
@limited
def jumps(case: str, file: Path | None, limits: Limits) -> None:
    """The exact worth of every seen history, with its weights, as a CSV table."""
    from thumbwright.distill import job
    from thumbwright.distill.progress import progress_on_terminal
    from thumbwright.distill.reading import read_case
    from thumbwright.distill.writing import write_file

    read = read_case(case)
    with progress_on_terminal() as progress:
        table = job.jumps(read, progress, limits)
    text = table.to_csv(index=False, lineterminator="\n")
    if file is None:
        click.echo(text, nl=False)
    else:
        click.echo(f"Wrote {write_file(file, text)} ({len(table)} histories).")


@verbs.command()
@CASE
@limited
@JSON
def outcomes(case: str, limits: Limits, as_json: bool) -> None:
    """What each agent, and the group, ends up doing when all of them reason exactly."""
    from thumbwright.distill import job
    from thumbwright.distill.reading import read_case

    found = job.outcomes(read_case(case), limits)
    _show(_as_json(found) if as_json else job.outcomes_text(found))


@verbs.command()
@CASE
@click.argument("rule", metavar="RULE")
@click.option(
    "--used-by",
    default="one",
    metavar="WHO",
    help="Who goes by the rule: one (the agent it is for), everybody who can, a share of them such "
    "as 25%, or ids joined by commas.",
)
@click.option(
    "--others-use",
    metavar="RULE2",
    help="A rule that all others go by who can; left out: they play exactly.",
)
@limited
@JSON
def price(
    case: str, rule: str, used_by: str, others_use: str | None, limits: Limits, as_json: bool
) -> None:
    """What a given rule costs, and how often each of its rows is used.

    RULE is a CSV file as written by "sheet" (rule.csv), or one of: exact, plain-count, alone.
    """
    from thumbwright.distill import job
    from thumbwright.distill.progress import progress_on_terminal
    from thumbwright.distill.reading import read_case
    from thumbwright.distill.ruleprice import Use

    read = read_case(case)
    with progress_on_terminal() as progress:
        found = job.price(read, rule, progress, limits, Use(used_by, others_use))
    _show(_as_json(found) if as_json else job.price_text(found))


@verbs.command()
@CASE
@click.argument("events", metavar="EVENTS", type=click.Path(path_type=Path))
@click.option(
    "--rule",
    metavar="FILE",
    help="A rule in a CSV file, as for price; left out: the first form that the case distils.",
)
@limited
@JSON
def replay(case: str, events: Path, rule: str | None, limits: Limits, as_json: bool) -> None:
    """Follow a record: what the rule says, and what the exact agent believes and does.

    EVENTS is a CSV file with a line for each step: step (1, 2, ...); sign, what the rule's agent
    itself observed (or sign_nats, its worth, for readings on a scale); and for each agent ID that
    it sees ID_shows: undecided, plus or minus, as seen when deciding. Under exchange "settle" that
    is at the end of the step, and ID_round may say in which round the answer came. What the model
    calls impossible is named.
    """
    from thumbwright.distill import job
    from thumbwright.distill.progress import progress_on_terminal
    from thumbwright.distill.reading import read_case

    read = read_case(case)
    with progress_on_terminal() as progress:
        found = job.replay(read, events, rule, progress, limits)
    _show(_as_json(found) if as_json else job.replay_text(read, found))


@verbs.command()
@CASE
@limited
@JSON
def sizes(case: str, limits: Limits, as_json: bool) -> None:
    """What each number of rows costs, up to that of the case, for each rule form it asks for.

    A long run can be stopped (Ctrl-C): the sizes worked out so far are printed, marked incomplete.
    """
    from thumbwright.distill import job
    from thumbwright.distill.progress import progress_on_terminal
    from thumbwright.distill.reading import read_case

    read = read_case(case)
    with progress_on_terminal() as progress:
        found = job.sizes(read, progress, limits)
    _show(_as_json(found) if as_json else job.sizes_text(read, found))
    if not found["complete"]:
        raise SystemExit(_STOPPED)


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command line and return its exit status.

    Parameters
    ----------
    argv : sequence of str, optional
        The words after the program's name; those of this process where left out.
    """
    try:
        before = signal.signal(signal.SIGTERM, _end_on_sigterm)
    except ValueError:  # not the main thread: signals are the caller's affair
        before = None
    try:
        status = _run(argv)
    finally:
        if before is not None:
            signal.signal(signal.SIGTERM, before)
    return status


def _run(argv: Sequence[str] | None) -> int:
    try:
        verbs.main(
            args=None if argv is None else list(argv),
            prog_name="thumbwright",
            standalone_mode=False,
        )
        # Flushed here rather than at exit, where a full disk or closed pipe prints a traceback.
        if sys.stdout is not None:
            sys.stdout.flush()
    except SystemExit as stop:
        return stop.code if isinstance(stop.code, int) else 1
    except (KeyboardInterrupt, click.Abort):
        return _STOPPED
    except click.ClickException as error:
        error.show()
        return error.exit_code
    except BrokenPipeError:
        _forget_stdout()
        return 1
    except Exception as error:
        return _explain(error)
    return 0


def _explain(error: Exception) -> int:
    """Print what went wrong in plain words and return the exit status for it."""
    from thumbwright.distill.faults import Faults
    from thumbwright.exact.errors import ModelError

    status = 1
    if isinstance(error, Faults):
        messages, status = error.messages, 2
    elif isinstance(error, ModelError):
        messages, status = (str(error),), 2
    elif isinstance(error, MemoryError):
        messages, status = (_TOO_LARGE,), 2
    elif isinstance(error, OSError):
        _forget_stdout()
        where = f"{error.filename}: " if error.filename else ""
        messages = (f"{where}{error.strerror or error}",)
    elif os.environ.get(TRACE):
        raise error
    else:
        messages = (
            f"a fault in the program itself, not in your case: {type(error).__name__}: {error}",
            f"(set {TRACE}=1 to see where, and please report it)",
        )
    for message in messages:
        click.echo(message, err=True)
    return status


def _show(text: str) -> None:
    click.echo(text.rstrip("\n"))


def _as_json(found: object) -> str:
    import json

    return json.dumps(found, indent=2, ensure_ascii=False, allow_nan=False)


def _forget_stdout() -> None:
    """Let what is still buffered for standard output go nowhere, so that exit is quiet."""
    try:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
    except (AttributeError, OSError, ValueError):  # no standard output of its own: nothing to do
        return


def _end_on_sigterm(number: int, _frame: FrameType | None) -> NoReturn:
    """Turn the signal into an exception, so that half-written files are removed on the way out."""
    raise SystemExit(128 + number)
