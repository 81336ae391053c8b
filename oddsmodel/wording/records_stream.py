"""What is wrong with records that are read in blocks, and what to do; notes on them."""

from __future__ import annotations

from oddsmodel.wording.plain import quoted
from oddsmodel.wording.say import Sentence

FAULTS: dict[str, tuple[Sentence, Sentence]] = {
    "too-many-values": (
        "The column holds more different values than fit into the memory that the run may use.",
        "Raise memory in [run] if the machine has more; or take the column out of the plan, write fewer different "
        "values (days without the time of day, say), or say what it is with kind.",
    ),
    "spreadsheet-in-memory": (
        "A spreadsheet is read as a whole, and it does not fit into the memory that the run may use.",
        "Save the sheet as CSV, or raise memory in [run] if the machine has more.",
    ),
    "file-changed": (
        "The file is no longer what it was when the run began.",
        "Begin again when nothing writes to it any more.",
    ),
}

SENTENCES: dict[str, Sentence] = {
    "identifier-not-checked": lambda facts: (
        f"The different values of {quoted(facts['column'])} do not fit into the memory that the run may use, so it was "
        "not checked whether some persons or units stand in several records. If they may, standard errors can be too "
        "small: check it beforehand, or raise memory in [run]."
    ),
    **{code: what for code, (what, _) in FAULTS.items()},
    **{f"{code}-remedy": remedy for code, (_, remedy) in FAULTS.items()},
}
