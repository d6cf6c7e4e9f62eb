"""What a saved study says of itself: what went in, by what it was computed, what came out in short."""

from __future__ import annotations

import dataclasses
import json
from dataclasses import dataclass, field
from typing import Any

from planner.fingerprint import of

ID_DIGITS = 16


@dataclass(frozen=True, slots=True, kw_only=True)
class Manifest:
    """One study. ``inputs`` is the fingerprint of the records, ``settings`` all that was asked beside them.

    ``runs`` counts what was finished of each strategy; ``finished`` is false for a study that was cancelled.
    ``made_at`` (UTC) and ``summary`` (the answer in short) are not part of the name: they follow from the rest.
    """

    command: str
    version: str
    sources: str
    probe: str
    inputs: str
    seed: int
    strategies: tuple[str, ...]
    settings: dict[str, Any]
    runs: int
    finished: bool = True
    made_at: str = ""
    warnings: tuple[str, ...] = ()
    summary: dict[str, Any] = field(default_factory=dict)

    @property
    def id(self) -> str:
        """Return the study's name: what went in, as 16 hexadecimal digits."""
        named = (self.command, self.version, self.sources, self.inputs, self.seed, self.strategies)
        return of(*named, self.settings, self.runs, self.finished)[:ID_DIGITS]


def to_json(manifest: Manifest, files: dict[str, str]) -> str:
    """Return the manifest's text with the hash of each file that belongs to the study, and one of its own content."""
    body = {"id": manifest.id, **dataclasses.asdict(manifest), "files": files}
    plain = json.loads(json.dumps(body))
    return json.dumps({**plain, "content": of(plain)}, ensure_ascii=False, indent=1)


def from_json(text: str) -> tuple[Manifest, dict[str, str]]:
    """Return manifest and file hashes; ValueError when the text is no manifest or was changed."""
    body = json.loads(text)
    try:
        if body.pop("content") != of(body):
            raise ValueError("its content is not what was saved")
        named, files = body.pop("id"), body.pop("files")
        body["strategies"], body["warnings"] = tuple(body["strategies"]), tuple(body["warnings"])
        manifest = Manifest(**body)
    except (AttributeError, KeyError, TypeError) as error:
        raise ValueError(f"not a manifest: {error}") from None
    if manifest.id != named:
        raise ValueError(f"its content makes the name {manifest.id}, not {named}")
    return manifest, files
