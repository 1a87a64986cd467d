"""Tables of others in any form that is read here."""

from __future__ import annotations

from campaign.errors import InputRefused
from campaign.model.loading import ForeignTable
from campaign.reading.tablefile import TableFile
from campaign.reading.tabletext import read_text_table


def read_foreign_table(file: TableFile, encoding: str | None = None) -> ForeignTable:
    """A table of somebody: ECSV and VOTable by what the file begins with, text otherwise.

    Raises
    ------
    InputRefused
        As the readers of each form; ``encoding-refused`` where a form has its own encoding.
    """
    begin = file.head.removeprefix(b"\xef\xbb\xbf").lstrip()
    is_ecsv, is_xml = begin.startswith(b"# %ECSV"), begin.startswith(b"<")
    if (is_ecsv or is_xml) and encoding is not None:
        raise InputRefused(
            f"{file.name} says itself which encoding it is in.",
            why="It is an ECSV table or a VOTable.",
            hint="Leave --encoding out.",
            code="encoding-refused",
        )
    if is_ecsv or is_xml:
        from campaign.reading.astrotables import read_ecsv, read_votable

        return read_ecsv(file) if is_ecsv else read_votable(file)
    return read_text_table(file, encoding)
