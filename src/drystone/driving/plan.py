"""What must run: the key of every step now, against the key that its outputs were made from.

A key holds the digest of the data that the step needs, its options, the fingerprint of its code,
the versions of its libraries, and the digests of the steps above it. A step is up to date when its
outputs exist and its done record holds the same key. Keys of such steps are written with an old
time stamp, so that the workflow engine comes to the same answer from time stamps alone, also in a
fresh clone without its own records.
"""

from __future__ import annotations

import hashlib
import os
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

from drystone.driving.files import read_json, write_json
from drystone.driving.fingerprint import CodeIndex, digest
from drystone.driving.review import CONFIG, Review, open_review
from drystone.driving.states import SheetState, file_digest, forget_states, sheet_state
from drystone.driving.steps import ANALYSES, Step, all_steps

CODE_MEMORY = Path("keys") / "code.json"
LONG_AGO = 946684800  # 2000-01-01: older than every output


@dataclass(frozen=True)
class Pending:
    """A step that must run.

    Parameters
    ----------
    before : the key that its present outputs were made from; None when it never finished
    """

    step: Step
    now: dict[str, Any]
    before: dict[str, Any] | None
    missing: tuple[str, ...]


class Plan:
    """Steps and keys of a review in its present state.

    Raises
    ------
    ConfigProblem, SheetProblem
        When config or sheet cannot be used; the message says where and what to do.
    """

    def __init__(self, review: Review) -> None:
        self.review = review
        self.steps = all_steps(review.settings)
        self.code = CodeIndex(read_json(review.cache / CODE_MEMORY))
        self.state: SheetState = sheet_state(review, self.code)
        config = review.root / CONFIG
        self.inputs = dict(self.state.inputs)
        if config.is_file():
            self.inputs[CONFIG.as_posix()] = file_digest(config)

    @cached_property
    def keys(self) -> dict[str, dict[str, Any]]:
        """Key of every step, by name."""
        made: dict[str, dict[str, Any]] = {}
        for step in self.steps.values():
            made[step.name] = self._key(step, made)
        return made

    @cached_property
    def pending(self) -> dict[str, Pending]:
        """Steps that must run, in running order, by name."""
        found: dict[str, Pending] = {}
        for step in self.steps.values():
            before = self.record(step)
            missing = tuple(path for path in step.outputs if not sound(self.review.root / path))
            if step.name == "publish":
                missing = (*missing, *changed_results(self.review.results))
            same = before is not None and before["digest"] == self.keys[step.name]["digest"]
            if not same or missing or any(name in found for name in step.upstream):
                found[step.name] = Pending(step, self.keys[step.name], before, missing)
        return found

    def record(self, step: Step) -> dict[str, Any] | None:
        """Key that the step's outputs were made from, with the state of the sheet then."""
        found: dict[str, Any] | None = read_json(self.review.root / step.done)
        return found if isinstance(found, dict) and "digest" in found else None

    def write_keys(self) -> None:
        """Write the keys for the workflow engine; a key that has not changed is not touched."""
        for step in self.steps.values():
            self._write_key(step)
        self.remember()

    def _write_key(self, step: Step) -> None:
        path = self.review.root / step.key
        key, present = self.keys[step.name], read_json(path)
        if step.name not in self.pending:
            if present != key:
                write_json(path, key)
            self._make_old(step)
            return
        if self._needs_another_key(step):
            tries = present.get("again", 0) if isinstance(present, dict) else 0
            write_json(path, {**key, "again": tries + 1})
        elif present != key:
            write_json(path, key)
        elif path.stat().st_mtime <= LONG_AGO:
            os.utime(path)

    def _make_old(self, step: Step) -> None:
        """Give key and outputs of a step that is up to date old time stamps, in the steps' order.

        So a copied folder looks to the engine as the one that it was copied from.
        """
        place = list(self.steps).index(step.name)
        os.utime(self.review.root / step.key, (LONG_AGO, LONG_AGO))
        for output in step.outputs:
            os.utime(self.review.root / output, (LONG_AGO + 1 + place,) * 2)

    def _needs_another_key(self, step: Step) -> bool:
        """Whether the engine might take the outputs for good although the step must run.

        So it is when nobody knows what they were made from (the step was interrupted), or when
        they were made from this very key and something else is lost (such as results/).
        """
        before = self.pending[step.name].before
        if before is None:
            return any((self.review.root / path).exists() for path in step.outputs)
        return bool(before["digest"] == self.keys[step.name]["digest"])

    def remember(self) -> None:
        """Store what makes the next plan fast."""
        self.state.remember()
        path = self.review.cache / CODE_MEMORY
        memory = self.code.memory()
        if read_json(path) != memory:
            write_json(path, memory)

    def leftovers(self) -> list[str]:
        """Folders of analyses, strategies and models that the config no longer has."""
        wanted = {str(Path(path).parent) for step in self.steps.values() for path in step.outputs}
        wanted |= {str(parent) for path in wanted for parent in Path(path).parents}
        root = self.review.root
        base = root / ANALYSES
        if not base.is_dir():
            return []
        found = [str(path.relative_to(root)) for path in sorted(base.rglob("*")) if path.is_dir()]
        unused = [path for path in found if path not in wanted]
        return [path for path in unused if str(Path(path).parent) not in unused]

    def forget(self) -> None:
        """Remove stored states of the sheet that nothing refers to."""
        records = [self.record(step) for step in self.steps.values()]
        states = {record.get("state", "") for record in records if record}
        forget_states(self.review, states | {self.state.name})

    def _key(self, step: Step, made: dict[str, dict[str, Any]]) -> dict[str, Any]:
        parts: dict[str, Any] = {
            "settings": step.settings,
            "code": self.code.closure(step.modules),
            "libraries": self.code.libraries(step.modules),
            "upstream": {name: made[name]["digest"] for name in step.upstream},
        }
        if step.rows:
            parts["rows"] = self._rows(step)
        parts = read_back(parts)
        return {"step": step.name, "digest": digest(parts), "parts": parts}

    def _rows(self, step: Step) -> str:
        if step.rows in ("slice", "figures"):
            analysis = self.review.settings.all_analyses()[step.analysis]
            sliced = step.rows == "slice"
            digest_of = self.state.slice_digest if sliced else self.state.figures_digest
            return digest_of(analysis)
        return self.state.check_digest() if step.rows == "check" else self.state.facts_digest()


def sound(path: Path) -> bool:
    """Whether an output exists and, for Parquet, has its end: a cut file is as good as none."""
    if path.suffix != ".parquet":
        return path.is_file()
    try:
        with path.open("rb") as file:
            file.seek(-4, os.SEEK_END)
            return file.read() == b"PAR1"
    except OSError:
        return False


def changed_results(results: Path) -> list[str]:
    """Published files that are gone or were changed since; the manifest first when it is gone."""
    manifest = read_json(results / "manifest.json")
    if not isinstance(manifest, dict) or "files" not in manifest:
        return ["results/manifest.json"]
    found = []
    for name, wanted in manifest["files"].items():
        try:
            content = (results / name).read_bytes()
        except OSError:
            content = b""
        if hashlib.sha256(content).hexdigest() != wanted:
            found.append(f"results/{name}")
    return found


def read_back(parts: dict[str, Any]) -> dict[str, Any]:
    """Parts as JSON gives them back (tuples become lists), so that old and new compare equal."""
    import json

    found: dict[str, Any] = json.loads(json.dumps(parts))
    return found


def make_plan(root: Path, content: dict[str, Any] | None = None) -> Plan:
    """Open the review folder ``root`` and plan it; see `Plan`."""
    return Plan(open_review(root, content))
