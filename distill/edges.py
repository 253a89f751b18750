"""Who sees whom, from a file beside the case: an edge list in CSV, or a directed graph in GraphML.

Both say the same: one line or edge per agent and agent that it sees, from the one that looks to the
one that is looked at. Agents come in the order in which the file first mentions them.

GraphML is an open format (graphml.graphdrawing.org) and is read with NetworkX, which is imported
only here and only when needed. It keeps no line numbers, so the places of nodes and edges are read
beside it with the parser of the standard library.
"""

from __future__ import annotations

import csv
import io
import re
import warnings
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from xml.parsers import expat

from thumbwright.distill.faults import Faults, fault_line, hint, quoted
from thumbwright.distill.fields import ID_PATTERN
from thumbwright.distill.network import LARGEST_GROUP

COLUMNS = ("agent", "sees")
LARGEST_FILE = 30_000_000
"""Bytes; an edge list of everybody sees everybody in the largest group stays below."""

_RESERVED = "any"
_UNDIRECTED = (
    "the graph is undirected, but seeing has a direction: A may see B while B does not see A; "
    'write edgedefault="directed" and, where two agents see each other, one edge each way'
)


@dataclass
class _Net:
    """The group as far as it has been read; faults are collected as (line, text)."""

    sees: dict[str, list[str]] = field(default_factory=dict)
    seen: dict[str, set[str]] = field(default_factory=dict)
    columns: dict[str, str] = field(default_factory=dict)
    faults: list[tuple[int, str]] = field(default_factory=list)

    def agent(self, name: str, line: int) -> bool:
        """Take in an agent when it is first mentioned; says whether the group can hold it."""
        if name in self.sees:
            return True
        if re.fullmatch(ID_PATTERN, name) is None:
            self.faults.append(
                (
                    line,
                    f"{quoted(name)} cannot name an agent (allowed a letter first, then letters "
                    "a-z A-Z, digits, - and _, at most 40 characters)",
                )
            )
            return False
        column = name.replace("-", "_")
        if name == _RESERVED:
            text = f"{quoted(name)} has a meaning of its own; choose another name"
            self.faults.append((line, text))
        elif column in self.columns:
            self.faults.append(
                (
                    line,
                    f"{quoted(name)} is the same name as {quoted(self.columns[column])} once - is "
                    "written _, as in columns and code; rename one",
                )
            )
        self.columns.setdefault(column, name)
        self.sees[name], self.seen[name] = [], set()
        return True

    def edge(self, agent: str, other: str, line: int) -> None:
        """Take in that one agent sees another."""
        usable = [self.agent(name, line) for name in dict.fromkeys((agent, other))]
        if not all(usable):
            return
        if agent == other:
            text = f"{quoted(agent)} cannot see itself; it knows its own state without looking"
            self.faults.append((line, text))
        elif other in self.seen[agent]:
            text = f"that {quoted(agent)} sees {quoted(other)} is said twice; once is enough"
            self.faults.append((line, text))
        else:
            self.sees[agent].append(other)
            self.seen[agent].add(other)


def read_edges(path: Path, shown_as: str) -> dict[str, list[str]]:
    """Read who sees whom.

    Parameters
    ----------
    path : Path
        Ends in ``.csv`` or ``.graphml``.
    shown_as : str
        What messages call the file.

    Returns
    -------
    dict of str to list of str
        For every agent, in the order of first mention, the agents that it sees, likewise.

    Raises
    ------
    Faults
        With everything that is wrong in the file, ``FILE:LINE: text`` each, sorted by line.
    OSError
        Where the file cannot be read.
    """
    data = path.read_bytes() if path.stat().st_size <= LARGEST_FILE else None
    if data is None:
        text = f"has more than {LARGEST_FILE} bytes; a group has at most {LARGEST_GROUP} agents"
        raise Faults([fault_line(shown_as, None, "", text)])
    net = _from_csv(data) if path.suffix.lower() == ".csv" else _from_graphml(data)
    if not net.sees and not net.faults:
        net.faults.append((1, "holds no agents"))
    if len(net.sees) > LARGEST_GROUP:
        text = f"has {len(net.sees)} agents (allowed at most {LARGEST_GROUP})"
        net.faults.append((1, text))
    if net.faults:
        ordered = sorted(dict.fromkeys(net.faults), key=lambda fault: fault[0])
        raise Faults(fault_line(shown_as, line, "", text) for line, text in ordered)
    return net.sees


def _from_csv(data: bytes) -> _Net:
    net = _Net()
    try:
        # Spreadsheets put a byte order mark in front.
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        net.faults.append((line, f"byte 0x{data[error.start]:02X} is not UTF-8"))
        return net
    rows = _rows(text, net)
    start = next(rows, None)
    if start is None:
        return net
    line, header = start
    if sorted(header) != sorted(COLUMNS):
        net.faults.append((line, _about_header(header)))
        return net
    alone: dict[str, int] = {}
    for line, row in rows:
        if len(row) != len(COLUMNS):
            text = f"has {len(row)} fields (allowed 2: agent, sees; for nobody write agent, comma)"
            net.faults.append((line, text))
            continue
        named = dict(zip(header, row, strict=True))
        if not named["agent"]:
            net.faults.append((line, "agent is blank; say who sees"))
        elif named["sees"]:
            net.edge(named["agent"], named["sees"], line)
        elif net.agent(named["agent"], line):
            alone.setdefault(named["agent"], line)
    for agent, line in alone.items():
        if net.sees[agent]:
            text = f"{quoted(agent)} sees nobody here, but {quoted(net.sees[agent][0])} elsewhere"
            net.faults.append((line, text))
    return net


def _rows(text: str, net: _Net) -> Iterator[tuple[int, list[str]]]:
    """The rows that hold anything, with the line each ends on, blanks around fields taken off."""
    reader = csv.reader(io.StringIO(text, newline=""), strict=True)
    while True:
        try:
            row = [entry.strip() for entry in next(reader)]
        except StopIteration:
            return
        except csv.Error as error:
            net.faults.append((reader.line_num, f"not CSV: {error}"))
            return
        if any(row):
            yield reader.line_num, row


def _about_header(header: list[str]) -> str:
    unknown = [name for name in header if name not in COLUMNS]
    if len(header) == 1 and re.search(r"[;\t]", header[0]):
        return "the first line must be agent,sees: columns are divided by commas"
    if unknown:
        return f"{quoted(unknown[0])} is an unknown column{hint(unknown[0], COLUMNS)}"
    missing = [name for name in COLUMNS if name not in header]
    if missing:
        return f"the column {missing[0]} is missing (the first line must be agent,sees)"
    return "a column stands twice (the first line must be agent,sees)"


def _from_graphml(data: bytes) -> _Net:
    net = _Net()
    places = _Places()
    try:
        places.read(data)
    except expat.ExpatError as error:
        net.faults.append((error.lineno, f"not XML: {expat.ErrorString(error.code)}"))
        return net
    if places.faults:
        net.faults += places.faults
        return net
    import networkx as nx

    try:
        with warnings.catch_warnings():
            # It warns of ports, which say where on a node an edge ends: no matter here.
            warnings.simplefilter("ignore")
            graph = nx.read_graphml(io.BytesIO(data), force_multigraph=True)
    except (nx.NetworkXError, ValueError, KeyError) as error:
        net.faults.append((1, f"not GraphML that can be read: {error}"))
        return net
    for node in graph.nodes:
        net.agent(str(node), places.nodes.get(str(node), 1))
    for agent, other in dict.fromkeys(graph.edges()):
        for line in places.edges.get((str(agent), str(other)), [1]):
            net.edge(str(agent), str(other), line)
    return net


class _Places:
    """Lines of the nodes and edges of a GraphML file, and what the group cannot be read from."""

    def __init__(self) -> None:
        self.nodes: dict[str, int] = {}
        self.edges: dict[tuple[str, str], list[int]] = {}
        self.faults: list[tuple[int, str]] = []
        self._graphs = 0
        self._root = ""

    def read(self, data: bytes) -> None:
        """Go through the file once; raises ExpatError where it is not XML."""
        parser = expat.ParserCreate(namespace_separator=" ")

        def start(name: str, has: dict[str, str]) -> None:
            self._element(name.rsplit(" ", 1)[-1], has, parser.CurrentLineNumber)

        def entity(*_: object) -> None:
            # Entities can make a short file endless, and GraphML needs none.
            self.faults.append((parser.CurrentLineNumber, "entities are not read here"))

        parser.StartElementHandler = start
        parser.EntityDeclHandler = entity
        parser.Parse(data, True)
        if self._root == "graphml" and not self._graphs:
            self.faults.append((1, "holds no graph"))
        for pair, lines in self.edges.items():
            for name in pair:
                if name not in self.nodes:
                    text = f"this edge ends at {quoted(name)}, but there is no such node"
                    self.faults.append((lines[0], text + hint(name, list(self.nodes)[:20])))

    def _element(self, name: str, has: dict[str, str], line: int) -> None:
        if not self._root:
            self._root = name
            if name != "graphml":
                text = f"the outermost element is {quoted(name)}, so this is not GraphML"
                self.faults.append((line, text))
        if name == "graph":
            self._graphs += 1
            if self._graphs > 1:
                self.faults.append((line, "is a second graph; a group is one graph"))
            elif has.get("edgedefault") != "directed":
                self.faults.append((line, _UNDIRECTED))
        elif name == "edge" and has.get("directed") == "false":
            text = "this edge is undirected; write one edge each way where two see each other"
            self.faults.append((line, text))
        elif name == "hyperedge":
            self.faults.append((line, "hyperedges are not read; seeing is between two agents"))
        if name == "node":
            if has.get("id", "") in self.nodes:
                self.faults.append((line, f"node {quoted(has.get('id', ''))} stands twice"))
            self.nodes.setdefault(has.get("id", ""), line)
        elif name == "edge":
            pair = (has.get("source", ""), has.get("target", ""))
            self.edges.setdefault(pair, []).append(line)
