"""Sentences of the inference floor, by code."""

from __future__ import annotations

from oddsmodel.wording.say import Sentence

SENTENCES: dict[str, Sentence] = {}
