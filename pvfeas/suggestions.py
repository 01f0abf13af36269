"""What somebody may have meant."""

from __future__ import annotations

from collections.abc import Iterable
from difflib import get_close_matches


def suggest(word: str, words: Iterable[str]) -> str:
    """The nearest of the known words, or an empty string."""
    known = {one.lower(): one for one in words}
    near = get_close_matches(word.lower(), list(known), n=1, cutoff=0.6)
    return known[near[0]] if near else ""


def did_you_mean(word: str, words: Iterable[str]) -> str:
    """'did you mean …?', or an empty string."""
    near = suggest(word, words)
    return f"did you mean {near}?" if near else ""
