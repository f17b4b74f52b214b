"""Which columns belong to the two arms: by the words for control and treatment, or by pairs.

Where no header says control or treatment, two headers that differ by one name (urban mean, rural
mean) are a pair when other quantities (SD, n) come with the same two names.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.fields import Field
from drystone.words import arms

Words = tuple[str, ...]
COMPANIONS = (
    *(known.SD, known.SE, known.N, known.VARIANCE, known.CV),
    *(known.LOWER, known.UPPER, known.SPREAD),
)


@dataclass(frozen=True)
class Arms:
    """The two arms of the team's table.

    Parameters
    ----------
    means : field of the mean of each arm
    tags : words that tell the arm's columns from the other arm's, by arm
    told : True when the words say which arm is the control
    reason : why the arms are what they are
    """

    means: dict[str, Field]
    tags: dict[str, Words]
    told: bool
    reason: str

    def belongs(self, field: Field, arm: str) -> bool:
        """Whether ``field`` carries the name of ``arm`` and not the other's."""
        other = arms.TREATMENT if arm == arms.CONTROL else arms.CONTROL
        if self.told and field.arm:
            return field.arm == arm
        mine, theirs = self.tags[arm], self.tags[other]
        crossed = bool(theirs) and _holds(field.rest, theirs)
        return bool(mine) and _holds(field.rest, mine) and not crossed


def find_arms(fields: Sequence[Field]) -> Arms | None:
    """Arms of the table; None when no two columns can be the means."""
    numeric = [field for field in fields if field.shape.is_number]
    return _by_words(numeric) or _by_pairs(numeric)


def _by_words(fields: Sequence[Field]) -> Arms | None:
    """Find the means whose headers (or codebook) say control and treatment."""
    best: tuple[tuple[int, ...], Field, Field] | None = None
    for control in (f for f in fields if f.arm == arms.CONTROL and _may_be_mean(f)):
        for treatment in (f for f in fields if f.arm == arms.TREATMENT and _may_be_mean(f)):
            if control.quantity != treatment.quantity:
                continue
            named = control.quantity == known.MEAN
            alike = _without_arm(control) == _without_arm(treatment)
            extra = len(control.rest) + len(treatment.rest)
            rank = (named, alike, -extra, control.shape.filled, -control.place, -treatment.place)
            if (named or alike) and (best is None or rank > best[0]):
                best = (rank, control, treatment)
    if best is None:
        return None
    means = {arms.CONTROL: best[1], arms.TREATMENT: best[2]}
    tags = {arm: _arm_words(means[arm], arm) for arm in arms.ARMS}
    names = ", ".join(f"'{' '.join(tags[arm]) or 'codebook'}' = {arm}" for arm in arms.ARMS)
    return Arms(means, tags, True, names)


def _by_pairs(fields: Sequence[Field]) -> Arms | None:
    ranked = sorted(_pairs(fields), key=lambda item: item[0], reverse=True)
    if not ranked:
        return None
    _, first, second, one, other = ranked[0]
    order, told, reason = _roles(one, other)
    pair = ((first, one), (second, other))
    control, treatment = pair if order else pair[::-1]
    return Arms(
        {arms.CONTROL: control[0], arms.TREATMENT: treatment[0]},
        {arms.CONTROL: control[1], arms.TREATMENT: treatment[1]},
        told,
        reason,
    )


def _pairs(fields: Sequence[Field]) -> Iterator[tuple[tuple[int, ...], Field, Field, Words, Words]]:
    """Pairs of columns that can be means, with the words that differ, and a rank."""
    candidates = [field for field in fields if _may_be_mean(field)]
    companions = [field for field in fields if field.quantity in COMPANIONS]
    for first, second in combinations(candidates, 2):
        if first.quantity != second.quantity:
            continue
        one, other = _difference(first.rest, second.rest)
        if not (one and other) or len(one) > 3 or len(other) > 3:
            continue
        support = sum(
            any(f.quantity == quantity and _only(f, one, other) for f in companions)
            and any(f.quantity == quantity and _only(f, other, one) for f in companions)
            for quantity in COMPANIONS
        )
        named = first.quantity == known.MEAN
        if support or named:
            told = any(_strong(words) for words in (one, other))
            rank = (support, named, told, first.shape.filled, -first.place, -second.place)
            yield rank, first, second, one, other


def _roles(one: Words, other: Words) -> tuple[bool, bool, str]:
    """Whether the first arm is the control, whether the words say so, and the reason."""
    a, b = " ".join(one), " ".join(other)
    for first, words in ((True, one), (False, other)):
        named = _strong(words)
        if named:
            return first == (named == arms.CONTROL), True, f"'{' '.join(words)}' = {named}"
    if _negates(one, other) or _negates(other, one):
        return _negates(one, other), True, f"'{a if _negates(one, other) else b}' = control"
    usual = [bool(known.REFERENCES & set(words)) for words in (one, other)]
    if usual[0] != usual[1]:
        name = a if usual[0] else b
        return usual[0], False, f"'{name}' is taken as control, as the usual reference of the two"
    return True, False, f"'{a}' is taken as control, since it stands first"


def _negates(words: Words, other: Words) -> bool:
    """Whether ``words`` say that ``other`` is absent: ungrazed beside grazed."""
    text, plain = "".join(words), "".join(other)
    return any(text == prefix + plain for prefix in known.NEGATIONS)


def _may_be_mean(field: Field) -> bool:
    return field.quantity in ("", known.MEAN, known.MEDIAN) and field.shape.filled > 0


def _strong(words: Words) -> str:
    named = [arm for arm in arms.ARMS if set(words) & known.STRONG[arm]]
    return named[0] if len(named) == 1 else ""


def _arm_words(field: Field, arm: str) -> Words:
    return tuple(word for word in field.rest if word in known.STRONG[arm])


def _without_arm(field: Field) -> Words:
    named = known.STRONG[arms.CONTROL] | known.STRONG[arms.TREATMENT]
    return tuple(word for word in field.rest if word not in named)


def _difference(first: Words, second: Words) -> tuple[Words, Words]:
    return (
        tuple(word for word in first if word not in second),
        tuple(word for word in second if word not in first),
    )


def _only(field: Field, mine: Words, theirs: Words) -> bool:
    return _holds(field.rest, mine) and not _holds(field.rest, theirs)


def _holds(words: Words, wanted: Words) -> bool:
    return set(wanted) <= set(words)
