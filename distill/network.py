"""Named shapes of groups, written out as who sees whom.

They are shorthands: whatever they say can be said in ``[agents.*]`` tables or in a network file.

Every shape has members ``a1`` … ``aN``. "``a2`` sees ``a1``" means that ``a2`` looks at what
``a1`` shows:

========  ==========================================================================
shape     who sees whom
========  ==========================================================================
one-way   two agents: ``a2`` sees ``a1``; ``a1`` sees nobody
mutual    two agents: each sees the other
relay     a chain, one way: ``a2`` sees ``a1``, ``a3`` sees ``a2`` and so on
ring      a closed circle, two ways: each sees both its neighbours (three or more)
star      two ways: ``a1`` is the hub and sees everybody; the others see only the hub
crowd     everybody sees everybody else
========  ==========================================================================
"""

from __future__ import annotations

SMALLEST = {"one-way": 2, "mutual": 2, "relay": 2, "ring": 3, "star": 3, "crowd": 2}
"""Least number of agents of each shape."""

LARGEST_GROUP = 1000
"""Most agents that a group may have."""

ENDINGS = (".csv", ".graphml")
"""Names of network files end in one of these; see ``distill.edges``."""

PAIRS = ("one-way", "mutual")
"""Shapes of exactly two agents."""


def who_sees_whom(shape: str, size: int) -> dict[str, list[str]]:
    """Return, for every agent id in order, the ids it sees, in order.

    Raises
    ------
    ValueError
        If the shape is unknown or cannot have ``size`` agents.
    """
    if shape not in SMALLEST:
        raise ValueError(f"unknown shape {shape!r} (allowed {', '.join(SMALLEST)})")
    if size < SMALLEST[shape] or (shape in PAIRS and size != 2):
        raise ValueError(f"a {shape} group cannot have {size} agents")
    ids = [f"a{number}" for number in range(1, size + 1)]
    last = size - 1
    sees: dict[str, list[str]] = {}
    for place, agent in enumerate(ids):
        if shape in ("one-way", "relay"):
            places = [place - 1] if place > 0 else []
        elif shape == "ring":
            places = sorted({(place - 1) % size, (place + 1) % size})
        elif shape == "star":
            places = list(range(1, last + 1)) if place == 0 else [0]
        else:
            places = [other for other in range(size) if other != place]
        sees[agent] = [ids[other] for other in places]
    return sees
