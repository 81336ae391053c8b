"""Sentences of the checks floor, by code."""

from __future__ import annotations

from oddsmodel.wording.checks_fit import FIT_SENTENCES
from oddsmodel.wording.checks_form import FORM_SENTENCES
from oddsmodel.wording.checks_goodness import SENTENCES as GOODNESS
from oddsmodel.wording.say import Sentence

SENTENCES: dict[str, Sentence] = {**FIT_SENTENCES, **FORM_SENTENCES, **GOODNESS}
