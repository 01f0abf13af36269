"""What a written file says about where it comes from: never a path, a time or a machine."""

from __future__ import annotations

from collections.abc import Mapping


def version() -> str:
    """The version of pvfeas."""
    from pvfeas import __version__

    return __version__


def provenance(question: str, title: str, sha256: str, seed: int) -> Mapping[str, str]:
    """Metadata of a figure or table."""
    return {
        "Title": title,
        "Creator": f"pvfeas {version()}",
        "Subject": f"{question}; seed {seed}; study sha256 {sha256}",
    }
