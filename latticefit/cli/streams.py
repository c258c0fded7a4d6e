"""Standard output and error on terminals and pipes whose encoding lacks some characters."""

from __future__ import annotations

import io
import json
import sys

__all__ = ["print_json", "tolerate_any_encoding"]


def tolerate_any_encoding() -> None:
    """Let what the streams cannot encode be written as an escape, instead of ending the program."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="backslashreplace")


def print_json(text: str) -> None:
    """Print JSON; where stdout cannot encode it, with JSON's own escapes, so that it stays valid."""
    try:
        text.encode(getattr(sys.stdout, "encoding", None) or "utf-8")
    except UnicodeEncodeError:
        text = json.dumps(json.loads(text), indent=2)
    print(text.rstrip("\n"))
