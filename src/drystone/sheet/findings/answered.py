"""Findings that a person answered: accepted ones, ones to ask again, answers without effect."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import replace

from drystone.sheet.answers import Answer, row_digest, text_digest
from drystone.sheet.draft import Draft
from drystone.sheet.notes import Note
from drystone.words import levels
from drystone.words.decisions import ACCEPT, DECISIONS, LEAVE_OUT

FILE = "answers.csv"
LEFT_OUT = "left out by an answer"
WITHOUT_EFFECT = "answer without effect"
AGAIN = "asked again: the row has changed since it was answered"

Accepted = tuple[Note, Answer]


def left_out_by_answer(draft: Draft) -> Iterator[Note]:
    """Compare every answered row with what it was, and book those that an answer leaves out."""
    rows = {name: row for row, name in enumerate(draft.text("row_id")) if name is not None}
    for answer in draft.answers.by_finding.values():
        if not answer.row:
            continue
        row = rows.get(answer.row)
        if row is None:
            yield _without_effect(answer, f"no row is called '{answer.row}'", "mend the name")
            continue
        draft.row_digests[row] = row_digest(draft, row)
        holds = draft.answers.holds(answer, draft.row_digests[row])
        if holds and answer.decision == LEAVE_OUT:
            draft.left_out.setdefault(row, (LEFT_OUT, _reason(answer)))


def sort_answered(draft: Draft, notes: Sequence[Note]) -> tuple[list[Note], list[Accepted]]:
    """Open findings, and accepted ones with the answer to each."""
    names, whole = draft.text("row_id"), _whole(notes)
    kept: list[Note] = []
    accepted: list[Accepted] = []
    met: set[tuple[str, str]] = set()
    for note in notes:
        key = ("" if note.row is None else str(names[note.row]), note.rule)
        answer = draft.answers.by_finding.get(key)
        if answer is None:
            kept.append(note)
            continue
        met.add(key)
        now = whole[note.rule] if note.row is None else draft.row_digests[note.row]
        if not draft.answers.holds(answer, now):
            kept.append(replace(note, wrong=f"{note.wrong} ({AGAIN} {_by(answer)})"))
        elif answer.decision == ACCEPT and note.level in (levels.ASK, levels.WARN):
            accepted.append((note, answer))
        else:
            kept.append(note)
            if answer.decision not in DECISIONS or answer.decision == ACCEPT:
                kept.append(_refused(answer, note))
    kept += _idle(draft, met)
    return list(dict.fromkeys(kept)), accepted


def _refused(answer: Answer, note: Note) -> Note:
    if answer.decision in DECISIONS:
        wrong = f"a finding of level {note.level} cannot be accepted ({_about(answer)})"
        return _without_effect(answer, wrong, f"mend the row, or decide '{LEAVE_OUT}'")
    known = ", ".join(f"'{word}'" for word in DECISIONS)
    wrong = f"'{answer.decision[:60]}' is no decision ({_about(answer)})"
    return _without_effect(answer, wrong, f"type one of: {known}")


def _idle(draft: Draft, met: set[tuple[str, str]]) -> Iterator[Note]:
    """Answers whose row is as it was and has no such finding; the rule may be mistyped."""
    rows = {str(name): row for row, name in enumerate(draft.text("row_id"))}
    for key, answer in draft.answers.by_finding.items():
        row = rows.get(answer.row)
        if key in met or (answer.row and row is None) or row in draft.left_out:
            continue
        if row is not None and not draft.answers.holds(answer, draft.row_digests[row]):
            continue  # the row was mended since
        where = f"row '{answer.row}'" if answer.row else "the sheet as a whole"
        wrong = f"{where} has no finding '{answer.rule}'"
        yield _without_effect(answer, wrong, "take the line out, or mend the rule's name")


def _whole(notes: Sequence[Note]) -> dict[str, str]:
    """Digest of what is said by each rule about no single row."""
    said: dict[str, list[str]] = defaultdict(list)
    for note in notes:
        if note.row is None:
            said[note.rule].append(f"{note.column} {note.wrong}")
    return {rule: text_digest(tuple(texts)) for rule, texts in said.items()}


def _without_effect(answer: Answer, wrong: str, todo: str) -> Note:
    return Note(
        levels.WARN,
        WITHOUT_EFFECT,
        wrong,
        todo,
        cell=answer.place,
        value=answer.row,
        sheet=FILE,
    )


def _about(answer: Answer) -> str:
    return f"row '{answer.row}', {answer.rule}" if answer.row else answer.rule


def _by(answer: Answer) -> str:
    words = [f"'{answer.decision}'", answer.who and f"by {answer.who}", answer.date]
    return " ".join(word for word in words if word)


def _reason(answer: Answer) -> str:
    return answer.reason or f"answered to '{answer.rule}' {_by(answer)}"
