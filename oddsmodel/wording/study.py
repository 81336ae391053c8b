"""Sentences of the study floor, by code."""

from __future__ import annotations

from oddsmodel.wording.say import Sentence

SENTENCES: dict[str, Sentence] = {}
