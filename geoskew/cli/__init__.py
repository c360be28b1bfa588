"""The command line: options in, library calls, one report line. One thin module a command."""

from __future__ import annotations

from geoskew.cli.main import main

__all__ = ["main"]
