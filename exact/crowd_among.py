"""A crowd that is not what its exact members take it for.

Some go by policies while the others play exactly and take everybody for exact; or observations are
not what everybody takes them for.

What happens has its actual weights; what the exact members make of it has those of their model, in
which everybody is exact. So there are two walks for each sort of members: the actual one, cut by
what they go by, and the one of the model, cut by the exact worths that the model gives.

How the exact members read what their model calls impossible: an answer as the same answer at the
latest earlier moment of this public history at which the model allowed it to a member of its sort,
or, where there is none, as no news, and whoever gave it as still undecided. A silence that the
model calls impossible is no news either: what has been shown stays worth what it was until that
silence is broken. For a pair that is how ``among`` reads; of several odd answers together it reads
each for itself, and the model's walks go on along the public history as it was shown.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from thumbwright.exact.arrays import BoolArray, FloatArray, IntArray
from thumbwright.exact.crowd_kinds import Crowd, Kind
from thumbwright.exact.crowd_play import Choice, Histories, times
from thumbwright.exact.crowd_policy import CrowdPolicy, reached
from thumbwright.exact.evidence.law import Law
from thumbwright.exact.play import Act
from thumbwright.exact.walk import Walk


class Among(Histories):
    """Public histories of a crowd some of whose members the others take for what they are not.

    Parameters
    ----------
    crowd : Crowd
        Those who go by a policy are kinds of their own.
    policies : sequence of (callable or None)
        Per kind; None is exact play that takes everybody for exact.
    sorts : sequence of int
        Per kind a number; kinds of one number are alike but for what they go by.
    laws : sequence of (Law or None), optional
        Per kind what its observations are really like; the exact members do not know.
    taken_for : sequence of Kind, optional
        Per sort what the exact members take it for, where its thresholds are really others.
    prior, horizon, labels, held, lasting
        As for :class:`Histories`.
    """

    def __init__(
        self,
        crowd: Crowd,
        prior: float,
        horizon: int,
        labels: IntArray,
        held: int | None = None,
        lasting: bool = False,
        policies: Sequence[CrowdPolicy | None] = (),
        sorts: Sequence[int] = (),
        laws: Sequence[Law | None] | None = None,
        taken_for: Sequence[Kind] | None = None,
    ) -> None:
        super().__init__(crowd, prior, horizon, labels, held, lasting, policies, laws)
        self._sorts = np.array(sorts, dtype=np.int64)
        self.reads = np.array([policy is None for policy in policies])
        leads = [list(sorts).index(sort) for sort in range(max(sorts) + 1)]
        size = len(labels)
        self._model_agents = [
            kind.agent for kind in taken_for or [crowd.kinds[lead] for lead in leads]
        ]
        self._model_walks = [
            Walk(agent.evidence, agent.thresholds, agent.observed_by(horizon))
            for agent in self._model_agents
        ]
        for walk in self._model_walks:
            walk.mass = np.repeat(walk.mass, size, axis=1)
            walk.log_scale = np.zeros(size)
        self._model_certain: list[FloatArray | None] = [None] * len(leads)
        self._model_aside = self._by_sort(self._aside)
        # Members that are read as undecided, the one that is held left out.
        self._quiet: IntArray = self._by_sort(self.free)
        self._model_left: FloatArray = np.zeros((len(leads), 2, size))
        self._model_said: FloatArray = np.zeros(size)
        self._level: FloatArray = np.zeros((len(leads), size))
        # Log ratio of each answer of each sort when the model last allowed it.
        self._latest: FloatArray = np.full((len(leads), 2, size), np.nan)
        self._news: FloatArray = np.zeros((len(leads), 2, 0))

    def _by_sort(self, numbers: IntArray) -> IntArray:
        """Numbers of each kind added up by sort."""
        total = np.zeros((int(self._sorts.max()) + 1, numbers.shape[1]), dtype=np.int64)
        np.add.at(total, self._sorts, numbers)
        return total

    def observe(self, step: int) -> None:
        """The private observations of a step."""
        super().observe(step)
        for k, (walk, agent) in enumerate(zip(self._model_walks, self._model_agents, strict=True)):
            for _ in range(agent.looks_at(step)):
                certain = walk.observe()
                if agent.evidence.certain_plus or agent.evidence.certain_minus:
                    met = self._model_certain[k]
                    self._model_certain[k] = certain if met is None else np.logaddexp(met, certain)

    def decide(self, columns: IntArray, round_: int = 0) -> Choice:
        """Cut what really commits, and, in the model, what the model has commit."""
        self._renew_levels(columns)
        for k, reads in enumerate(self.reads):
            if reads:
                self._value[k, columns] = self._level[self._sorts[k], columns]
        choice = self._choice(columns, round_)
        self._cut_model(columns)
        # Members expect rounds for as long as the model has somebody who could answer in them.
        expected = self._quiet[:, columns] + self._model_aside > 0
        expected &= ~np.isnan(self._news).all(axis=1)
        return replace(choice, open=choice.open | expected.any(axis=0))

    def worth(self, kind: int, columns: IntArray) -> FloatArray:
        """What a member takes what it has been shown to be worth (nats), shape (A,)."""
        self._renew_levels(columns)
        return np.asarray(self._level[self._sorts[kind], columns])

    def allowed(self, choice: Choice, kind: int) -> BoolArray:
        """Whether the model allows a member to say plus, to say minus now, shape (2, A)."""
        return np.asarray(~np.isnan(self._news[self._sorts[kind]]))

    def _renew_levels(self, columns: IntArray) -> None:
        """What exact members of each sort take what has been shown to be worth."""
        left = self._model_left[..., columns]
        with np.errstate(invalid="ignore"):
            silence = left[:, 0] - left[:, 1]
            for sort in range(len(self._model_walks)):
                others = self._quiet[:, columns] + self._model_aside
                others[sort] = np.maximum(others[sort] - 1, 0)
                value = self._model_said[columns] + times(others, silence).sum(axis=0)
                old = self._level[sort, columns]
                self._level[sort, columns] = np.where(np.isnan(value), old, value)

    def _cut_model(self, columns: IntArray) -> None:
        """Cut the walks of the model, and note what each answer is worth now."""
        some = columns if len(columns) < len(self) else None
        self._news = np.full((len(self._model_walks), 2, len(columns)), np.nan)
        for sort, walk in enumerate(self._model_walks):
            certain, self._model_certain[sort] = self._model_certain[sort], None
            if not walk.observed:
                continue
            act = Act(self._level[sort, columns])
            plus, minus = reached(walk, self._prior, act, len(columns))
            divided = walk.divide(plus, minus, some)
            if certain is not None:
                divided[:2] = np.logaddexp(divided[:2], certain[..., columns])
            with np.errstate(invalid="ignore"):
                self._news[sort] = divided[:2, 0] - divided[:2, 1]
            self._model_left[sort][:, columns] = divided[2]
            old = self._latest[sort][:, columns]
            self._latest[sort][:, columns] = np.where(
                np.isnan(self._news[sort]), old, self._news[sort]
            )

    def show(
        self,
        choice: Choice,
        at: IntArray,
        columns: IntArray,
        commits: tuple[IntArray, IntArray],
        step: int,
        round_: int,
    ) -> None:
        """Let members commit, and let the exact ones read it."""
        super().show(choice, at, columns, commits, step, round_)
        readers = self.free[self.reads][:, columns].sum(axis=0)
        for sign, numbers in enumerate(commits):
            number = self._by_sort(numbers)
            worth = self._latest[:, sign][:, columns]
            odd = np.isnan(self._news[:, sign][:, at])
            read = np.where(np.isnan(worth), 0, number)
            with np.errstate(invalid="ignore"):
                self._model_said[columns] += times(read, worth).sum(axis=0)
            self._quiet[:, columns] -= read
            self.record.odd[columns] += (number * odd).sum(axis=0) * readers

    def take(self, index: IntArray | BoolArray) -> None:
        """Go on with the chosen histories, some perhaps several times."""
        super().take(index)
        for walk in self._model_walks:
            walk.mass, walk.log_scale = walk.mass[:, index], walk.log_scale[index]
        self._quiet, self._model_said = self._quiet[:, index], self._model_said[index]
        self._model_left, self._level = self._model_left[..., index], self._level[:, index]
        self._latest = self._latest[..., index]
