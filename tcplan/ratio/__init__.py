"""The ratio of two resistors: its drift, what is likely, its worst case, and what causes it."""
