"""What identifies an input file in the run record."""

import hashlib
from pathlib import Path


def sha256_of(path: Path) -> str:
    """Return the SHA-256 of a file's bytes."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()
