"""Where records lie and what they are called: UTC_board_item_plan.sqlite, in ~/sinkwright unless told
otherwise.

Labels come from people, so nothing in a label may lead out of the folder, or make a name that a file system
refuses. A name that is taken gets a counter.
"""

from __future__ import annotations

import unicodedata
from pathlib import Path

from sinkwright.errors import RecordError
from sinkwright.records.header import RecordHeader

SUFFIX = ".sqlite"
#: File systems take 255 bytes a name (common practice, no source); SQLite adds "-journal", we a counter.
_LABEL_BYTES = 60
_MAX_COUNTER = 1000


def default_folder() -> Path:
    """The folder for records when none is named. Raises RecordError where there is no home folder."""
    try:
        return Path.home() / "sinkwright"
    except RuntimeError:
        raise RecordError(
            "the home folder cannot be found, so there is no usual place for records",
            remedy="Name a folder for them.",
        ) from None


def safe_label(label: str, otherwise: str) -> str:
    """A label as part of a file name: letters, digits, dots and dashes; `otherwise` if nothing is left."""
    plain = unicodedata.normalize("NFKC", label)
    kept = "".join(c if c.isalnum() or c == "." else "-" for c in plain)
    kept = "-".join(part for part in kept.split("-") if part).strip(".-")
    kept = kept.encode("utf-8", "ignore")[:_LABEL_BYTES].decode("utf-8", "ignore").strip(".-")
    return kept or otherwise


def name_of(header: RecordHeader) -> str:
    """The record's name without folder, counter and suffix."""
    parts = (
        header.started.strftime("%Y%m%dT%H%M%SZ"),
        safe_label(header.board_name, "unnamed-board"),
        safe_label(header.item, "unlabelled"),
        safe_label(header.plan_name, "unnamed-plan"),
    )
    return "_".join(parts)


def reserve_path(folder: Path, header: RecordHeader) -> Path:
    """Make an empty file under the first free name in `folder`, and the folder if it is missing.

    Raises RecordError when the folder cannot be made or written.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for count in range(1, _MAX_COUNTER):
            counter = "" if count == 1 else f"_{count}"
            path = folder / f"{name_of(header)}{counter}{SUFFIX}"
            try:
                path.open("xb").close()
            except FileExistsError:
                continue
            return path
    except OSError as error:
        raise cannot_write(folder, error) from error
    raise RecordError(
        "all names for a new record are taken", where=str(folder), remedy="Name another folder."
    )


def cannot_write(path: Path, error: OSError) -> RecordError:
    """The sentence for a folder or file that the system does not let us write."""
    if isinstance(error, FileExistsError | NotADirectoryError):
        what = "cannot hold a record, because there is a file where a folder is needed"
    else:
        what = f"cannot be written ({error.strerror or error})"
    return RecordError(what, where=str(path), remedy="Name a folder that can be written.")
