"""Blocks of a region computed one after another, or several at once, in bounded memory."""

from __future__ import annotations

from geoskew.engine.blocks import computed_blocks, pending_blocks

__all__ = ["computed_blocks", "pending_blocks"]
