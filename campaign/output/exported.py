"""What ``export`` wrote, in words and as JSON; which form of table a name asks for."""

from __future__ import annotations

import os

from campaign.errors import UsageRefused
from campaign.model.exported import EXCHANGE_FORMS, ExchangeForm, Exported
from campaign.output.documents import document

FORM_OF_ENDING: dict[str, ExchangeForm] = {
    ".csv": "csv",
    ".ecsv": "ecsv",
    ".vot": "votable",
    ".votable": "votable",
    ".xml": "votable",
    ".json": "json",
}


def form_of_name(path: str) -> ExchangeForm:
    """The form of table that the ending of a file's name asks for.

    Raises
    ------
    UsageRefused
    """
    ending = os.path.splitext(path)[1].lower()
    if ending in FORM_OF_ENDING:
        return FORM_OF_ENDING[ending]
    told = f"ends in {ending}" if ending else "has no ending"
    raise UsageRefused(
        f"The form of the table cannot be told from the name {path!r}.",
        why=f"It {told}; known are {', '.join(FORM_OF_ENDING)}.",
        hint=f"Add --as with one of {', '.join(EXCHANGE_FORMS)}, or choose another ending.",
        code="form-unknown",
        details={"accepted": list(FORM_OF_ENDING)},
    )


def exported_line(done: Exported) -> str:
    """What was written, in one line."""
    rows = f"{done.rows} row{'' if done.rows == 1 else 's'}"
    return f"wrote {done.path}: {rows} of {done.kind} as {_SPOKEN[done.form]}, {done.size_bytes} bytes"


def exported_json(done: Exported, as_of: str) -> str:
    """The document ``campaign/export/1``."""
    data = {
        "kind": done.kind,
        "form": done.form,
        "path": done.path,
        "rows": done.rows,
        "size_bytes": done.size_bytes,
    }
    return document("export", data, as_of=as_of, warnings=done.warnings)


_SPOKEN: dict[ExchangeForm, str] = {"csv": "CSV", "ecsv": "ECSV", "votable": "VOTable", "json": "JSON"}
