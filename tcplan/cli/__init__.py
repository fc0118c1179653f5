"""The command line: one file per command; each parses, calls one workflow and prints."""
