"""Puts data/ into wheels as geoskew/data_files; an editable install keeps reading the checkout's data/."""

from __future__ import annotations

from typing import Any

from hatchling.builders.hooks.plugin.interface import BuildHookInterface


class DataFolder(BuildHookInterface):  # type: ignore[type-arg]
    """The same folder forced into every build would leave a stale copy of it in editable installs."""

    def initialize(self, version: str, build_data: dict[str, Any]) -> None:
        """Add the folder to a standard wheel; ``version`` is the build tool's name for the kind of build."""
        if version == "standard":
            build_data["force_include"]["data"] = "geoskew/data_files"
