"""What a written file says about where it comes from: never a path, a time or a machine."""

from __future__ import annotations

from collections.abc import Mapping


def version() -> str:
    """The version of pvfeas."""
    from pvfeas import __version__

    return __version__


def question_text(question: Mapping[str, object]) -> str:
    """The question and the options that change numbers, as one line."""
    said = [str(question["name"])]
    for name, value in question.items():
        if name == "scenarios" and isinstance(value, list | tuple):
            said.append(f"scenarios {', '.join(str(one) for one in value)}")
        elif name != "name":
            said.append(
                f"{name.replace('_', ' ')} {value:g}"
                if isinstance(value, float)
                else f"{name.replace('_', ' ')} {value}"
            )
    return "; ".join(said)


def columns(question: Mapping[str, object], sha256: str) -> Mapping[str, str]:
    """The last columns of a CSV."""
    return {"pvfeas": version(), "question": question_text(question), "study_sha256": sha256}


def metadata(title: str, question: Mapping[str, object], sha256: str) -> Mapping[str, str]:
    """Metadata of a figure."""
    return {
        "Title": title,
        "Creator": f"pvfeas {version()}",
        "Subject": f"{question_text(question)}; study sha256 {sha256}",
    }


def line(question: Mapping[str, object], points: int, sha256: str) -> str:
    """The last line but one of a text."""
    return f"pvfeas {version()}; {question_text(question)}; {points} points; study {sha256[:16]}"
