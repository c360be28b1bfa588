"""Composition: reads a scenario's inputs, evaluates, and hands the results to the outputs."""

from __future__ import annotations
