"""The published JSON Schema of the session file. `python -m thalweg.storage.schema` writes it anew after the models changed."""

from __future__ import annotations

import json
from pathlib import Path

from thalweg.paths import data_folder
from thalweg.storage.files import write_atomically
from thalweg.storage.migrations import CURRENT_FORMAT
from thalweg.storage.session import Session


def schema_path() -> Path:
    return data_folder("resources") / "session.schema.json"


def schema_text() -> str:
    """JSON Schema, draft 2020-12, of the present format."""
    head = {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": f"Thalweg session, format {CURRENT_FORMAT}"}
    schema = {**Session.model_json_schema(), **head}
    return json.dumps(schema, indent=1, sort_keys=True) + "\n"


if __name__ == "__main__":
    write_atomically(schema_path(), schema_text().encode())
