"""Several agents play by rules, the others stay exact and take everybody for exact.

Unlike a single adopter, several change what each of them is shown, so the group is always played
whole: agents with a policy decide by it, all others read what they see by the exact solution. Where
everybody has a policy nobody reads anything by the exact solution, and nothing is off-model.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from thumbwright.exact.among import AmongOthersReader
from thumbwright.exact.arrays import FloatArray
from thumbwright.exact.engine import Reader, Solution, Track, run
from thumbwright.exact.errors import ModelError
from thumbwright.exact.play import Policy, RuleReader


@dataclass(frozen=True)
class Adopters:
    """How a group fares some of whose agents use policies.

    Attributes
    ----------
    tracks : tuple of Track
        One per agent, in the group's order, with the actual probabilities of this play.
    off_model : float
        Expected number of times that an exact agent, still undecided, was shown something that
        the exact solution calls impossible.
    usage : mapping of agent id to ndarray of float, shape (rows, 2)
        As in :class:`Play`, for the agents with a policy, where it was counted.
    """

    tracks: tuple[Track, ...]
    off_model: float
    usage: Mapping[str, FloatArray]


def adopt_together(solution: Solution, policies: Mapping[str, Policy], rows: int = 0) -> Adopters:
    """Play a group in which these agents use these policies.

    Parameters
    ----------
    solution : Solution
        The exact play of the group.
    policies : mapping of agent id to callable
        ``policy(situation) -> act``.
    rows : int
        If above 0, usage is counted for this many lines of each policy.

    Raises
    ------
    ModelError
        Where a policy is for an agent that is not in the group.
    """
    group = solution.group
    unknown = [agent for agent in policies if agent not in group.index]
    if unknown:
        raise ModelError(f"there is no agent {', '.join(unknown)} in this group")
    among = {
        agent.id: AmongOthersReader(solution, i)
        for i, agent in enumerate(group.agents)
        if agent.id not in policies
    }
    ruled = {
        agent: RuleReader(policy, group.prior_plus, rows) for agent, policy in policies.items()
    }
    readers: list[Reader] = [
        ruled[agent.id] if agent.id in ruled else among[agent.id] for agent in group.agents
    ]
    tracks = run(group, readers)
    usage = {agent: one.usage for agent, one in ruled.items() if one.usage is not None}
    return Adopters(tracks, sum(one.off_model for one in among.values()), usage)
