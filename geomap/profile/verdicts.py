"""From probabilities and draws to verdicts along the line.

Verdicts are columns here: nothing in this module knows what makes a soil unsuitable.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Scale:
    """The verdicts: their words in the order of their codes, their codes from the worst to the best, and limits.

    Attributes
    ----------
    unsuitable_from
        Probability of unsuitable from which a place is called so.
    suitable_p_unsuitable, suitable_p_not_assessed
        Probabilities of unsuitable and of not assessed that a suitable place must stay below.
    """

    words: tuple[str, ...]
    worst_first: tuple[int, ...]
    unsuitable_from: float = 0.5
    suitable_p_unsuitable: float = 0.1
    suitable_p_not_assessed: float = 0.2

    @property
    def in_words(self) -> str:
        """The limits in a sentence."""
        return (
            f"unsuitable from probability {self.unsuitable_from:g}; suitable only where unsuitable is below "
            f"{self.suitable_p_unsuitable:g} and not assessed below {self.suitable_p_not_assessed:g}; "
            "otherwise treat or not assessed, the likelier; not assessed where there is no data"
        )

    def column(self, word: str) -> int:
        """Return the code of a word."""
        return self.words.index(word)

    @property
    def rank(self) -> NDArray[np.int8]:
        """For each code, 0 for the worst."""
        rank = np.empty(len(self.words), dtype=np.int8)
        rank[list(self.worst_first)] = np.arange(len(self.words))
        return rank


def suitability(probability: Floats, scale: Scale) -> NDArray[np.object_]:
    """Return the verdict in a word for each row of probabilities.

    With the usual limits: unsuitable at a probability of unsuitable of 0.5 or more. Suitable only where unsuitable
    is below 0.1, not assessed below 0.2, and suitable at least as likely as treat. Otherwise treat or not
    assessed, the likelier.

    Parameters
    ----------
    probability
        Shape (rows, verdicts); rows add to 1.
    scale
        The verdicts.
    """
    suitable, treat, unsuitable, unknown = (
        probability[:, scale.column(w)] for w in ("suitable", "treat", "unsuitable", "not assessed")
    )
    is_sure = (unsuitable < scale.suitable_p_unsuitable) & (unknown < scale.suitable_p_not_assessed)
    is_suitable = is_sure & (suitable >= treat)
    words: NDArray[np.object_] = np.select(
        [unsuitable >= scale.unsuitable_from, is_suitable, treat >= unknown],
        [np.array(w, dtype=object) for w in ("unsuitable", "suitable", "treat")],
        default=np.array("not assessed", dtype=object),
    )
    return words


def zone_draws(
    probability: Floats, in_zone: NDArray[np.bool_], fields: Iterable[NDArray[np.float32]], scale: Scale
) -> NDArray[np.int8]:
    """Draw the governing verdict of the design zone of each step, jointly along the line.

    Each realization is one field of uniform values over the profile, correlated as the ground is. A cell takes the
    verdict in which the field's value falls when the verdicts are stacked from the worst to the best, so neighbors
    turn bad together; the zone takes the worst of its cells. (Probability field: Srivastava 1992, SPE 24753; from
    memory.)

    Parameters
    ----------
    probability
        Shape (steps, rows, verdicts).
    in_zone
        Cells of the design zone in natural ground, shape (steps, rows).
    fields
        One array of shape (steps, rows) for each realization, values in 0 to 1.
    scale
        The verdicts.

    Returns
    -------
    ndarray
        Verdict code, shape (steps, realizations). A step without a cell in the zone takes the best verdict.
    """
    step, row = np.nonzero(in_zone)
    limits = np.cumsum(probability[step, row][:, list(scale.worst_first)], axis=1)[:, :-1]
    order = np.array(scale.worst_first, dtype=np.int8)
    draws = []
    for field in fields:
        rank = (field[step, row][:, None] >= limits).sum(axis=1).astype(np.int8)
        worst = np.full(len(in_zone), len(order) - 1, dtype=np.int8)
        np.minimum.at(worst, step, rank)
        draws.append(order[worst])
    return np.column_stack(draws)


def shares(draws: NDArray[np.int8], verdicts: int) -> Floats:
    """Return the share of each verdict among the draws of each step, shape (steps, verdicts); rows add to 1."""
    return np.stack([(draws == code).mean(axis=1) for code in range(verdicts)], axis=1)


def governing_rule(
    rules: Sequence[str], rule_verdict: Sequence[str], membership: Floats, verdict: NDArray[np.object_], scale: Scale
) -> NDArray[np.object_]:
    """Return for each step the rule behind its verdict.

    Of the rules that give this verdict or a worse one, it is the one with the greatest share of the soil: a step may
    come out as "treat" because too much of it may be unsuitable, and then the rule that says so is named. For the
    best verdict only the rules that give it count.

    Parameters
    ----------
    rules, rule_verdict
        Names of the columns of `membership`, and the verdict that each gives.
    membership
        Share of the soil that each rule decided, shape (steps, rules).
    verdict
        Verdict of each step.
    scale
        The verdicts.
    """
    rank = dict(zip(scale.words, scale.rank.tolist(), strict=True))
    of_rule = np.array([rank[word] for word in rule_verdict])
    of_step = np.array([rank[word] for word in verdict])
    best = of_step[:, None] == scale.rank.max()
    bad_enough = np.where(best, of_rule == of_step[:, None], of_rule <= of_step[:, None]) & (membership > 0)
    chosen: NDArray[np.object_] = np.array(rules, dtype=object)[(membership + bad_enough).argmax(axis=1)]
    return chosen
