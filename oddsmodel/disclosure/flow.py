"""The accounting of records without small counts, and its figure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from oddsmodel.disclosure.hiding import Hiding
from oddsmodel.results.figures import FlowFigure
from oddsmodel.results.study import Exclusion, Flow
from oddsmodel.wording import say

TOGETHER = "other-reasons-together"


def disclosed_flow(flow: Flow, model: int, hiding: Hiding) -> Flow:
    """Hidden reasons told together as one, with their sum where anyone can work it out from the other counts."""
    read = hiding.count(flow.read, "read", flow.read)
    analysed = hiding.count(flow.analysed, "records", model)
    events = hiding.count(flow.events, "events", model)
    hidden = {i for i in range(len(flow.left_out)) if hiding.hides("left out", model, i)}
    total = sum(flow.left_out[i].records or 0 for i in hidden)
    told = read is not None and analysed is not None and len(hidden) > 1 and total >= hiding.threshold
    left_out = _together(flow.left_out, hidden, total if told else None)
    hiding.taken += len(hidden)
    return Flow(read, left_out, analysed, events)


def disclosed_exclusions(excluded: Sequence[Exclusion], hiding: Hiding) -> tuple[Exclusion, ...]:
    """The study's own list of exclusions; hidden ones are told together without a sum."""
    hidden = {i for i in range(len(excluded)) if hiding.hides("excluded", i)}
    hiding.taken += len(hidden)
    return _together(excluded, hidden, None)


def _together(left_out: Sequence[Exclusion], hidden: set[int], total: int | None) -> tuple[Exclusion, ...]:
    if len(hidden) == 1:
        return tuple(replace(one, records=None) if i in hidden else one for i, one in enumerate(left_out))
    shown = tuple(one for i, one in enumerate(left_out) if i not in hidden)
    return (*shown, Exclusion(TOGETHER, say(TOGETHER), total)) if hidden else shown


def disclosed_flow_figure(figure: FlowFigure, flow: Flow) -> FlowFigure:
    """The figure of an accounting as disclosed; its text alternative is made anew."""
    left_out = tuple((one.reason, one.records) for one in flow.left_out)
    return replace(
        figure,
        alt=say("flow-as-shown", read=flow.read, left_out=left_out, analysed=flow.analysed),
        read=flow.read,
        left_out=left_out,
        analysed=flow.analysed,
        events=flow.events if figure.events is not None else None,
    )
