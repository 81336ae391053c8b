"""The study plan: read, validated and written."""
