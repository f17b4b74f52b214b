"""Columns of the two arms: means, spreads, n, labels, each with the reason for the guess."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.fields import Field
from drystone.sheet.guess.pairs import Arms
from drystone.words import arms, spreads


@dataclass(frozen=True)
class Guess:
    """One of our columns and the team's column that it may be.

    Parameters
    ----------
    ours : drystone's name of the column
    theirs : the team's header
    reason : why, in a few words
    place : place among the table's headers
    """

    ours: str
    theirs: str
    reason: str
    place: int


@dataclass(frozen=True)
class ArmColumns:
    """What was found of the arms.

    Parameters
    ----------
    used, spare : guesses that hold, and columns that could stand in with their reason
    spread_kind : kind of the spread columns; blank when SDs are there or the kind is unknown
    asks : what a person must decide
    """

    used: tuple[Guess, ...]
    spare: tuple[Guess, ...]
    spread_kind: str
    asks: tuple[str, ...]


PLAIN = {
    known.N: "n",
    known.SD: "sd",
    known.LOWER: "lower",
    known.UPPER: "upper",
    known.Q1: "q1",
    known.Q3: "q3",
    known.SMALLEST: "min",
    known.LARGEST: "max",
}
OTHER_SPREADS = {
    known.SE: spreads.SE,
    known.VARIANCE: spreads.VARIANCE,
    known.CV: spreads.CV_PERCENT,
    known.SPREAD: "",
}


def arm_columns(fields: Sequence[Field], found: Arms) -> ArmColumns:
    """Guesses for the columns of both arms."""
    chosen = {arm: _by_quantity(fields, found, arm) for arm in arms.ARMS}
    used, spare, asks = [], [], list(_asks(found))
    for arm in arms.ARMS:
        mean = found.means[arm]
        used.append(_guess(f"{arm}_mean", mean, _why_mean(mean, found, arm)))
        used += [
            _guess(f"{arm}_{ours}", chosen[arm][quantity], f"'{_spoken(chosen[arm][quantity])}'")
            for quantity, ours in PLAIN.items()
            if quantity in chosen[arm]
        ]
    kind = _other_kind(chosen)
    for arm in arms.ARMS:
        for quantity, name in OTHER_SPREADS.items():
            field = chosen[arm].get(quantity)
            if field is None:
                continue
            if known.SD not in chosen[arm] and name == kind:
                words = f"spread is {name}" if name else "a spread of unknown kind"
                used.append(_guess(f"{arm}_spread", field, words))
            else:
                spare.append(_guess(f"{arm}_spread", field, _beside(field, chosen[arm], name)))
    more_used, more_asks = _shared_n(fields, chosen)
    return ArmColumns(
        (*used, *more_used, *_texts(fields, found)),
        tuple(spare),
        kind or "",
        tuple(asks + more_asks),
    )


def _by_quantity(fields: Sequence[Field], found: Arms, arm: str) -> dict[str, Field]:
    """Best column of each quantity that belongs to ``arm``: nearest words, then most filled."""
    means = {field.place for field in found.means.values()}
    chosen: dict[str, tuple[tuple[int, ...], Field]] = {}
    common = set(found.means[arm].rest)
    for field in fields:
        numeric = field.shape.is_number or not field.shape.filled
        if field.place in means or not field.quantity or not numeric:
            continue
        if not found.belongs(field, arm) or not _plausible(field):
            continue
        rank = (-len(set(field.rest) ^ common), field.shape.filled, -field.place)
        if field.quantity not in chosen or rank > chosen[field.quantity][0]:
            chosen[field.quantity] = (rank, field)
    return {quantity: field for quantity, (_, field) in chosen.items()}


def _plausible(field: Field) -> bool:
    """Whether the values can be what the header says; n is whole and positive."""
    values = field.shape
    if field.quantity == known.N and values.filled:
        return values.whole >= 0.5 * values.numbers and values.lowest >= 0
    return True


def _other_kind(chosen: dict[str, dict[str, Field]]) -> str | None:
    """Kind of the spread to use where no arm has an SD; None when there is none."""
    if any(known.SD in columns for columns in chosen.values()):
        return None
    for quantity, name in OTHER_SPREADS.items():
        if any(quantity in columns for columns in chosen.values()):
            return name
    return None


def _beside(field: Field, columns: dict[str, Field], name: str) -> str:
    sd = columns.get(known.SD)
    if sd is None:
        return f"{name or 'a spread'} is not used, since another kind is"
    pairs = zip(field.shape.texts, sd.shape.texts, strict=True)
    alone = sum(bool(mine) and not bool(theirs) for mine, theirs in pairs)
    rows = f"{alone} rows have only this" if alone else "no row has only this"
    return f"{name or 'a spread'} beside the SD, which is used; {rows}"


def _shared_n(
    fields: Sequence[Field], chosen: dict[str, dict[str, Field]]
) -> tuple[list[Guess], list[str]]:
    if any(known.N in columns for columns in chosen.values()):
        return [], []
    single = [f for f in fields if f.quantity == known.N and not f.arm and f.shape.is_number]
    single = [field for field in single if _plausible(field) and len(field.rest) <= 2]
    if not single:
        return [], ["no column gives the number of replicates; rows without n leave"]
    field = min(single, key=lambda item: (len(item.rest), item.place))
    ask = (
        f"'{field.header}' is taken as n of each arm; when it is the total of both arms, give each "
        "arm a column of its own"
    )
    return [_guess(f"{arm}_n", field, "the only n; taken as n of each arm") for arm in arms.ARMS], [
        ask
    ]


def _texts(fields: Sequence[Field], found: Arms) -> Iterator[Guess]:
    """Labels, names and places in the paper, of each arm."""
    taken: set[str] = set()
    for field in fields:
        if field.quantity or not field.shape.filled:
            continue
        for arm in arms.ARMS:
            ours = _text_column(field, found, arm)
            if ours and ours not in taken:
                taken.add(ours)
                yield _guess(ours, field, f"'{field.header}' with the name of the {arm} arm")
                break


def _text_column(field: Field, found: Arms, arm: str) -> str:
    if not found.belongs(field, arm):
        return ""
    left = set(field.rest) - set(found.tags[arm]) - known.STRONG[arm]
    if left & known.ID_WORDS and left <= known.ID_WORDS | known.FILLERS:
        return f"{arm}_id"
    if field.shape.is_text and left <= known.LABEL_WORDS | known.FILLERS:
        return f"{arm}_label"
    if left & {"source", "page", "figure", "fig", "table"}:
        return f"{arm}_source_place"
    return ""


def _asks(found: Arms) -> Iterator[str]:
    if not found.told:
        yield (
            f"which arm is the control? {found.reason}; the sheet does not say. If it is the other "
            "one, exchange control and treatment in the column map"
        )
    if any(field.quantity == known.MEDIAN for field in found.means.values()):
        yield "the centres are medians; say so under 'defaults: centre_kind' in the config"


def _why_mean(mean: Field, found: Arms, arm: str) -> str:
    what = f"'{_spoken(mean)}'" if mean.quantity else "numbers without another name"
    named = " ".join(found.tags[arm])
    return f"{what}; '{named}' = {arm}" if named and found.told else f"{what}; {found.reason}"


def _spoken(field: Field) -> str:
    names = known.QUANTITIES.get(field.quantity, frozenset())
    return next((word for word in field.words if word in names), field.quantity)


def _guess(ours: str, field: Field, reason: str) -> Guess:
    return Guess(ours, field.header, reason, field.place)
