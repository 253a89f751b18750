"""The exported code, run as its users run it: each language in a process of its own.

Every engine is handed the situations as tables, one for each function. Where a call with many
situations is refused as a whole, the driver halves them until it knows which one it was.
"""

from __future__ import annotations

import shutil
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

from tests.distill.exports.agreement import Answers, Asked, Engine, Run, Spoil
from thumbwright.distill.code.inputs import Part
from thumbwright.distill.findings import Findings

REFUSED = "refused"
WARNINGS = ("-std=c99", "-Wall", "-Wextra", "-Wpedantic", "-Werror", "-Wconversion", "-Wshadow")

PLAIN_PYTHON = """
import csv, sys
sys.path.insert(0, sys.argv[1])
import watch_rule
assert watch_rule._numpy is None
for name in sys.argv[2:]:
    with open(sys.argv[1] + "/asked_" + name + ".csv") as file:
        kinds, *rows = csv.reader(file)
    read = [{"whole": int, "nats": float, "name": str}[kind] for kind in kinds]
    for row in rows:
        try:
            print(getattr(watch_rule, name)(*(r(cell) for r, cell in zip(read, row))))
        except ValueError:
            print("refused")
"""

MANY_PYTHON = """
import csv, sys
import numpy
sys.path.insert(0, sys.argv[1])
import watch_rule
def ask(function, columns):
    try:
        said = function(*columns)
        assert isinstance(said, numpy.ndarray)
        return said.tolist()
    except ValueError:
        if len(columns[0]) == 1:
            return ["refused"]
        half = len(columns[0]) // 2
        parts = [column[:half] for column in columns], [column[half:] for column in columns]
        return ask(function, parts[0]) + ask(function, parts[1])
for name in sys.argv[2:]:
    with open(sys.argv[1] + "/asked_" + name + ".csv") as file:
        kinds, *rows = csv.reader(file)
    types = {"whole": "int64", "nats": "float64", "name": "str"}
    columns = [numpy.array(c).astype(types[k]) for k, c in zip(kinds, zip(*rows))]
    print(*ask(getattr(watch_rule, name), columns), sep="\\n")
"""

MANY_R = """
args <- commandArgs(trailingOnly = TRUE)
source(file.path(args[1], "watch_rule.R"))
ask <- function(f, columns) {
  said <- tryCatch(do.call(f, columns), error = function(refusal) NULL)
  if (!is.null(said)) return(if (is.numeric(said)) sprintf("%.17g", said) else said)
  size <- length(columns[[1]])
  if (size == 1) return("refused")
  half <- size %/% 2
  c(ask(f, lapply(columns, head, half)), ask(f, lapply(columns, tail, size - half)))
}
for (name in args[-1]) {
  lines <- readLines(file.path(args[1], paste0("asked_", name, ".csv")))
  cells <- do.call(rbind, strsplit(lines[-1], ","))
  kinds <- strsplit(lines[1], ",")[[1]]
  columns <- lapply(seq_along(kinds), function(k) {
    if (kinds[k] == "name") cells[, k] else as.numeric(cells[, k])
  })
  writeLines(ask(get(name), columns))
}
"""

JAVASCRIPT = """
import { readFileSync } from "node:fs";
import { pathToFileURL } from "node:url";
const [folder, ...names] = process.argv.slice(2);
const rule = await import(pathToFileURL(folder + "/watch_rule.mjs"));
for (const name of names) {
  const lines = readFileSync(`${folder}/asked_${name}.csv`, "utf8").trimEnd().split("\\n");
  const kinds = lines[0].split(",");
  for (const line of lines.slice(1)) {
    const given = line.split(",").map((cell, k) => (kinds[k] === "name" ? cell : Number(cell)));
    try {
      console.log(String(rule[name](...given)));
    } catch (refusal) {
      if (!(refusal instanceof RangeError)) throw refusal;
      console.log("refused");
    }
  }
}
"""


def tables(asked: Asked) -> dict[str, tuple[Part, list[tuple[int | str | float, ...]]]]:
    """What each function is asked: its arguments in their order."""
    made: dict[str, tuple[Part, list[tuple[int | str | float, ...]]]] = {}
    if asked.parts.value is not None:
        made["value"] = (asked.parts.value, [*asked.distinct(asked.parts.value)])
    given = asked.given_to(asked.parts.decide)
    rows = [(s.tally, *one) for s, one in zip(asked.situations, given, strict=True)]
    made["decide"] = (asked.parts.decide, [*dict.fromkeys(rows)])
    return made


def process(command: Callable[[Path], list[str]], codes: bool = False) -> Run:
    """An engine that is a process: it reads tables and prints a line for each of their rows."""

    def run(folder: Path, findings: Findings, asked: Asked) -> Answers:
        asked_for = tables(asked)
        for name, (part, rows) in asked_for.items():
            table = [_kinds(name, part), *(_cells(name, part, row, codes) for row in rows)]
            text = "".join(",".join(cells) + "\n" for cells in table)
            (folder / f"asked_{name}.csv").write_text(text)
        made = [*command(folder), str(folder), *asked_for]
        lines = output(made).splitlines()
        assert len(lines) == sum(len(rows) for _, rows in asked_for.values()), lines[:3]
        values = None
        if "value" in asked_for:
            part, rows = asked_for["value"]
            known = {
                row: None if line == REFUSED else float(line)
                for row, line in zip(rows, lines[: len(rows)], strict=True)
            }
            values = [known[given] for given in asked.given_to(part)]
        part, rows = asked_for["decide"]
        said = dict(zip(rows, lines[-len(rows) :], strict=True))
        given = asked.given_to(part)
        answers = [said[s.tally, *one] for s, one in zip(asked.situations, given, strict=True)]
        return Answers(values, [None if line == REFUSED else line for line in answers])

    return run


def output(command: list[str]) -> str:
    """What a command prints; what it complains of fails the test."""
    done = subprocess.run(command, capture_output=True, text=True, timeout=120, check=False)
    assert done.returncode == 0, done.stdout[-2000:] + done.stderr[-2000:]
    assert not done.stderr, done.stderr[-2000:]
    return done.stdout


def _kinds(name: str, part: Part) -> list[str]:
    kinds = ["name" if one.names else "whole" for one in part.inputs]
    return kinds if name == "value" else ["nats" if part.valued else "whole", *kinds]


def _cells(name: str, part: Part, row: tuple[int | str | float, ...], codes: bool) -> list[str]:
    names = [one.names for one in part.inputs]
    names = names if name == "value" else [(), *names]
    return [
        str(known.index(str(cell))) if codes and known else str(cell)
        for known, cell in zip(names, row, strict=True)
    ]


def c_driver(folder: Path) -> list[str]:
    """Compile the rule with a reader of tables; the names of its functions are all it knows."""
    text = (folder / "watch_rule.c").read_text("utf-8")
    loops = []
    for name in ("value", "decide"):
        path = folder / f"asked_{name}.csv"
        if not path.exists():
            continue
        kinds = path.read_text().split("\n")[0].split(",")
        types = {"whole": "(long)", "nats": "", "name": "(int)"}
        given = ", ".join(f"{types[kind]}cell[{k}]" for k, kind in enumerate(kinds))
        said = "print_worth" if name == "value" else "print_answer"
        loops.append(f'    open_table(argv[1], "{name}");')
        loops.append(f"    while (next_row({len(kinds)})) {said}({name}({given}));")
    source = C_DRIVER.replace("LOOPS", "\n".join(loops))
    (folder / "driver.c").write_text(source, "utf-8")
    assert "int decide(" in text
    output(["gcc", *WARNINGS, "-o", str(folder / "driver"), str(folder / "driver.c")])
    return [str(folder / "driver")]


C_DRIVER = """
#include "watch_rule.c"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static FILE *table;
static double cell[64];

static void open_table(const char *folder, const char *name)
{
    char path[4096], kinds[4096];
    snprintf(path, sizeof path, "%s/asked_%s.csv", folder, name);
    table = fopen(path, "r");
    if (!table || !fgets(kinds, sizeof kinds, table)) exit(2);
}

static int next_row(int width)
{
    char line[4096], *at = line;
    if (!fgets(line, sizeof line, table)) return 0;
    for (int k = 0; k < width; k++) {
        cell[k] = strtod(at, &at);
        at++;
    }
    return 1;
}

void print_worth(double nats);
void print_worth(double nats)
{
    if (isnan(nats)) printf("refused\\n");
    else printf("%.17g\\n", nats);
}

static void print_answer(int said)
{
    const char *names[] = {"refused", "undecided", "plus", "minus"};
    printf("%s\\n", names[said + 1]);
}

int main(int argc, char **argv)
{
    if (argc < 2) return 2;
LOOPS
    return 0;
}
"""


def lacks(*programs: str) -> Callable[[], str]:
    """Why an engine cannot run here: a program that is not installed."""
    return lambda: ", ".join(f"{p} is not installed" for p in programs if not shutil.which(p))


def with_driver(text: str, name: str, *command: str) -> Callable[[Path], list[str]]:
    """A command with a driver that is written beside the rule."""

    def prepared(folder: Path) -> list[str]:
        (folder / name).write_text(text, "utf-8")
        return [*command, str(folder / name)]

    return prepared


def spoils(at_least: str, changed: str) -> tuple[Spoil, ...]:
    """The same changes in each language; the first pair is the comparison of ``decide``."""
    return (
        Spoil("a step", r"\bstep <= 2\b", "step <= 1"),
        Spoil("a comparison of steps", r"\bstep >= 3\b", "step > 3"),
        Spoil("a state", r"(upper ===? [_.A-Z]*)UNDECIDED\b", r"\1MINUS"),
        Spoil("a bar", r"-4\b", "-5"),
        Spoil("a comparison with a bar", at_least, changed),
        Spoil("a worth", r"123456\.789", "123456.788", on="worths"),
        Spoil("the tie", r"(?i)(tie (?:=|<-) )1e-09", r"\g<1>1e-12", on="worths"),
    )


PYTHON_SPOILS = spoils(r"number >= plus_at", "number > plus_at")
ENGINES = (
    Engine(
        "Python",
        "watch_rule.py",
        process(with_driver(PLAIN_PYTHON, "driver.py", sys.executable, "-S", "-I")),
        PYTHON_SPOILS,
    ),
    Engine(
        "numpy",
        "watch_rule.py",
        process(with_driver(MANY_PYTHON, "driver.py", sys.executable, "-W", "error")),
        PYTHON_SPOILS,
    ),
    Engine(
        "R",
        "watch_rule.R",
        process(with_driver(MANY_R, "driver.R", "Rscript", "--vanilla")),
        spoils(r"number >= high", "number > high"),
        ulps=1,
        missing=lacks("Rscript"),
    ),
    Engine(
        "JavaScript",
        "watch_rule.mjs",
        process(with_driver(JAVASCRIPT, "driver.mjs", "node")),
        spoils(r"number >= plusAt", "number > plusAt"),
        missing=lacks("node"),
    ),
    Engine(
        "C",
        "watch_rule.c",
        process(c_driver, codes=True),
        spoils(r"tally >= 3\b", "tally > 3"),
        missing=lacks("gcc"),
    ),
)
