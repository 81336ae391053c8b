"""Runs a plan from records to results; the one place that strings the parts together."""
