"""The revisions of the schema that this program knows, so that everyday opening needs no Alembic.

A test holds this list equal to the files in ``migrations/versions``.
"""

from __future__ import annotations

from typing import Final

KNOWN_REVISIONS: Final = ("0001", "0002", "0003")
HEAD_REVISION: Final = KNOWN_REVISIONS[-1]
FORMAT: Final = "1"
