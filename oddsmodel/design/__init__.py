"""From a vetted formula and records to a model matrix."""
