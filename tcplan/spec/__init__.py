"""The spec sheet: its content, how its numbers are printed, and one writer per format."""
