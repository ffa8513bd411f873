"""The published JSON Schema of what outlets are sent: alerts, and trials.

Run as a program it writes the file anew.
"""

import json
from pathlib import Path

from pydantic import TypeAdapter

from service.outlets.trial import Trial
from service.tell.alert_body import Alert

SCHEMA_FILE = "alert.schema.json"
DIALECT = "https://json-schema.org/draft/2020-12/schema"


def schema_text() -> str:
    """The schema as it stands in the file."""
    schema = TypeAdapter[Alert | Trial](Alert | Trial).json_schema(mode="serialization")
    titled = {"$schema": DIALECT, "title": "Message"} | schema
    return json.dumps(titled, indent=2, ensure_ascii=False, sort_keys=True) + "\n"


if __name__ == "__main__":
    (Path(__file__).parent / SCHEMA_FILE).write_text(schema_text(), encoding="utf-8")
