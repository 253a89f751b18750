"""Networks from files: what is read, and every fault with the line it stands on."""

from __future__ import annotations

import time
from pathlib import Path

import networkx as nx
import pytest
from hypothesis import given, strategies as st

from tests.distill.test_case import PLAIN
from thumbwright.distill import edges
from thumbwright.distill.case import Case
from thumbwright.distill.faults import Faults
from thumbwright.distill.network import who_sees_whom
from thumbwright.distill.reading import read_case

GRAPHML = """<?xml version="1.0" encoding="UTF-8"?>
<graphml xmlns="http://graphml.graphdrawing.org/xmlns">
  <graph id="G" edgedefault="directed">
    <node id="mill"/>
    <node id="upper"/>
    <node id="barn"/>
    <edge source="mill" target="upper"/>
    <edge source="barn" target="mill"/>
    <edge source="barn" target="upper"/>
  </graph>
</graphml>
"""
FIELD = {"mill": ["upper"], "upper": [], "barn": ["mill", "upper"]}


def net(tmp_path: Path, name: str, text: str | bytes) -> dict[str, list[str]]:
    path = tmp_path / name
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return edges.read_edges(path, name)


def faults(tmp_path: Path, name: str, text: str | bytes) -> tuple[str, ...]:
    with pytest.raises(Faults) as caught:
        net(tmp_path, name, text)
    return caught.value.messages


def case_with(tmp_path: Path, keys: str, **files: str) -> Case:
    for stem, text in files.items():
        (tmp_path / f"{stem}.{'graphml' if text.startswith('<') else 'csv'}").write_text(text)
    path = tmp_path / "field.toml"
    path.write_text(PLAIN + f'[network]\nthresholds = "even"\n{keys}\n', encoding="utf-8")
    return read_case(path)


@pytest.mark.parametrize(
    "text",
    [
        "agent,sees\nmill,upper\nbarn,mill\nbarn,upper\n",
        "sees,agent\r\nupper,mill\r\nmill,barn\r\nupper,barn\r\n",
        '\ufeffagent, sees\n\nmill, upper\n ,\nupper,\n"barn",mill\nbarn,upper',
    ],
)
def test_an_edge_list(tmp_path: Path, text: str) -> None:
    assert net(tmp_path, "e.csv", text) == FIELD
    assert list(net(tmp_path, "e.csv", text)) == list(FIELD)


def test_a_graph(tmp_path: Path) -> None:
    got = net(tmp_path, "g.graphml", GRAPHML)
    assert got == FIELD
    assert list(got) == list(FIELD)


@given(st.lists(st.tuples(st.integers(0, 5), st.integers(0, 5)), max_size=20, unique=True))
def test_both_kinds_say_the_same(
    tmp_path_factory: pytest.TempPathFactory, pairs: list[tuple[int, int]]
) -> None:
    folder = tmp_path_factory.mktemp("both")
    graph = nx.DiGraph()
    graph.add_nodes_from(f"n{k}" for k in range(6))
    graph.add_edges_from((f"n{a}", f"n{b}") for a, b in pairs if a != b)
    nx.write_graphml(graph, folder / "g.graphml")
    lines = [f"n{k}," for k in range(6) if not graph.out_degree(f"n{k}")]
    lines += [f"{a},{b}" for a, b in graph.edges]
    (folder / "e.csv").write_text("\n".join(["agent,sees", *lines]))
    one = edges.read_edges(folder / "g.graphml", "g")
    other = edges.read_edges(folder / "e.csv", "e")
    assert {k: set(v) for k, v in one.items()} == {k: set(v) for k, v in other.items()}
    assert one == {node: list(graph.successors(node)) for node in graph}


CSV_FAULTS = {
    "empty": ("", "e.csv:1: holds no agents"),
    "header only": ("agent,sees\n", "e.csv:1: holds no agents"),
    "no header": ("a,b\nb,c\n", 'e.csv:1: "a" is an unknown column (allowed agent, sees)'),
    "misspelt": ("agent,see\na,b\n", '"see" is an unknown column (allowed agent, sees; did you'),
    "extra": ("agent,sees,weight\na,b,1\n", 'e.csv:1: "weight" is an unknown column'),
    "one column": ("agent\na\n", "e.csv:1: the column sees is missing"),
    "twice": ("agent,sees,sees\na,b,c\n", "e.csv:1: a column stands twice"),
    "semicolons": ("agent;sees\na;b\n", "e.csv:1: the first line must be agent,sees: columns"),
    "short row": ("agent,sees\na,b\nb\n", "e.csv:3: has 1 fields"),
    "long row": ("agent,sees\na,b,c\n", "e.csv:2: has 3 fields"),
    "itself": ("agent,sees\na,b\nb,b\n", 'e.csv:3: "b" cannot see itself'),
    "duplicate": ("agent,sees\na,b\nb,a\na,b\n", 'e.csv:4: that "a" sees "b" is said twice'),
    "blank agent": ("agent,sees\n,b\n", "e.csv:2: agent is blank"),
    "odd id": ("agent,sees\na,1b\n", 'e.csv:2: "1b" cannot name an agent (allowed a letter first'),
    "reserved": ("agent,sees\na,any\n", 'e.csv:2: "any" has a meaning of its own'),
    "same column": ("agent,sees\na-b,a_b\n", 'e.csv:2: "a_b" is the same name as "a-b" once'),
    "nobody and somebody": ("agent,sees\na,\na,b\n", 'e.csv:2: "a" sees nobody here, but "b"'),
    "open quote": ('agent,sees\n"a,b\n', "e.csv:2: not CSV: unexpected end of data"),
    "not text": (b"agent,sees\na,\xff\n", "e.csv:2: byte 0xFF is not UTF-8"),
}


@pytest.mark.parametrize("name", CSV_FAULTS)
def test_faults_of_an_edge_list(tmp_path: Path, name: str) -> None:
    text, says = CSV_FAULTS[name]
    (message,) = faults(tmp_path, "e.csv", text)
    assert says in message


GRAPHML_FAULTS = {
    "undirected": (
        '"directed"',
        '"undirected"',
        "g.graphml:3: the graph is undirected, but seeing",
    ),
    "silent": (' edgedefault="directed"', "", "g.graphml:3: the graph is undirected"),
    "edge": (
        'get="upper"/>\n    <edge source="b',
        'get="upper" directed="false"/>\n    <edge source="b',
        "g.graphml:7: this edge is undirected",
    ),
    "itself": ('target="mill"', 'target="barn"', 'g.graphml:8: "barn" cannot see itself'),
    "duplicate": (
        'barn" target="mill"',
        'barn" target="upper"',
        'g.graphml:9: that "barn" sees "upper"',
    ),
    "no such node": (
        'target="mill"',
        'target="mil"',
        'g.graphml:8: this edge ends at "mil", but there is no such node (allowed mill',
    ),
    "odd id": ('"mill"', '"0"', 'g.graphml:4: "0" cannot name an agent'),
    "node twice": ('id="barn"', 'id="mill"', 'g.graphml:6: node "mill" stands twice'),
    "second graph": (
        "</graph>",
        '</graph><graph edgedefault="directed"/>',
        "g.graphml:10: is a second graph",
    ),
    "hyperedge": (
        '<node id="barn"/>',
        '<node id="barn"/><hyperedge/>',
        "g.graphml:6: hyperedges are",
    ),
    "not XML": ("</graph>", "</grap>", "g.graphml:10: not XML: mismatched tag"),
    "other XML": ("graphml", "svg", 'the outermost element is "svg", so this is not GraphML'),
    "entities": (
        "<graphml",
        '<!DOCTYPE a [<!ENTITY b "c">]><graphml',
        "entities are not read here",
    ),
    "odd data": (
        '<node id="barn"/>',
        '<node id="barn"><data key="k">1</data></node>',
        "not GraphML that can be read",
    ),
}


@pytest.mark.parametrize("name", GRAPHML_FAULTS)
def test_faults_of_a_graph(tmp_path: Path, name: str) -> None:
    old, new, says = GRAPHML_FAULTS[name]
    assert old in GRAPHML
    assert any(says in m for m in faults(tmp_path, "g.graphml", GRAPHML.replace(old, new))), says


def test_every_fault_is_reported_in_the_order_of_lines(tmp_path: Path) -> None:
    found = faults(tmp_path, "e.csv", "agent,sees\na,a\n1,b\nb,c,d\nb,c\nb,c\n")
    assert [message.split(":")[1] for message in found] == ["2", "3", "4", "6"]


def test_files_too_large_are_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    many = "agent,sees\n" + "".join(f"a{k},\n" for k in range(1001))
    assert faults(tmp_path, "e.csv", many) == ("e.csv:1: has 1001 agents (allowed at most 1000)",)
    monkeypatch.setattr(edges, "LARGEST_FILE", 20)
    assert "has more than 20 bytes" in faults(tmp_path, "e.csv", many)[0]


# --- in a case -----------------------------------------------------------------------------------


def test_a_case_takes_its_network_from_beside_it(tmp_path: Path) -> None:
    text = "agent,sees\nmill,upper\nbarn,mill\nbarn,upper\n"
    listed = case_with(tmp_path, 'file = "e.csv"', e=text)
    drawn = case_with(tmp_path, 'file = "g.graphml"', g=GRAPHML)
    assert {key: agent.sees for key, agent in listed.agents.items()} == FIELD
    assert listed.agents["barn"].name == "barn"
    assert listed.agents["barn"].thresholds == "even"
    assert listed.rule_agent == "mill"
    # The digest covers what the network says, wherever it says it.
    tables = "".join(
        f'[agents.{key}]\nthresholds = "even"\nsees = {seen}\n' for key, seen in FIELD.items()
    )
    (tmp_path / "tables.toml").write_text(PLAIN + tables.replace("'", '"'))
    assert listed.digest == drawn.digest == read_case(tmp_path / "tables.toml").digest
    other = case_with(tmp_path, 'file = "e.csv"', e=text.replace("barn,mill\n", ""))
    assert other.digest != listed.digest
    named = case_with(tmp_path, 'file = "e.csv"\nnames = ["M", "U", "B"]', e=text)
    assert [agent.name for agent in named.agents.values()] == ["M", "U", "B"]


def test_shapes_are_shorthands_of_a_file(tmp_path: Path) -> None:
    for shape, size in (("relay", 4), ("ring", 4), ("star", 4), ("crowd", 3)):
        sees = who_sees_whom(shape, size)
        rows = [f"{a},{b}" for a, seen in sees.items() for b in seen or [""]]
        names = ", ".join(f'"Agent {k + 1}"' for k in range(size))
        case = case_with(
            tmp_path, f'file = "e.csv"\nnames = [{names}]', e="\n".join(["agent,sees", *rows])
        )
        (tmp_path / "shape.toml").write_text(
            PLAIN + f'[network]\nthresholds = "even"\nshape = "{shape}"\nsize = {size}\n'
        )
        drawn = read_case(tmp_path / "shape.toml")
        assert {key: set(a.sees) for key, a in case.agents.items()} == {
            key: set(a.sees) for key, a in drawn.agents.items()
        }


def test_faults_of_both_files_come_together(tmp_path: Path) -> None:
    with pytest.raises(Faults) as caught:
        case_with(tmp_path, 'file = "e.csv"\nnames = 3', e="agent,sees\na,a\n")
    first, second = caught.value.messages
    assert first.startswith(f"{tmp_path}/field.toml:")
    assert "network.names: must be a list" in first
    assert second.startswith(f'{tmp_path}/e.csv:2: "a" cannot see itself')


@pytest.mark.parametrize(
    ("keys", "says"),
    [
        ('file = "none.csv"', 'network.file: "none.csv" cannot be read: No such file'),
        ('file = "a.csv"', 'network.file: "a.csv" cannot be read: Is a directory'),
        ('file = "e.csv"\nnames = ["A"]', "has 1 names for 2 agents"),
        ('file = "e.csv"\nsize = 2', "network.size: goes with a shape only"),
    ],
)
def test_a_network_that_does_not_fit_its_case(tmp_path: Path, keys: str, says: str) -> None:
    (tmp_path / "a.csv").mkdir()
    with pytest.raises(Faults) as caught:
        case_with(tmp_path, keys, e="agent,sees\na,b\n")
    assert says in caught.value.messages[0]


def test_the_rule_must_be_for_somebody_in_the_file(tmp_path: Path) -> None:
    path = tmp_path / "field.toml"
    (tmp_path / "e.csv").write_text("agent,sees\nmill,upper\n")
    text = PLAIN.replace('"any"', '"mil"') + '[network]\nthresholds = "even"\nfile = "e.csv"\n'
    path.write_text(text)
    with pytest.raises(Faults, match="did you mean mill"):
        read_case(path)


def test_a_crowd_of_a_thousand_is_read_in_seconds(tmp_path: Path) -> None:
    (tmp_path / "c.toml").write_text(
        PLAIN + '[network]\nthresholds = "even"\nshape = "crowd"\nsize = 1000\n'
    )
    start = time.perf_counter()
    assert len(read_case(tmp_path / "c.toml").agents["a1"].sees) == 999
    assert time.perf_counter() - start < 30.0
