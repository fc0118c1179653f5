"""The short compositions that users and the command line both call."""
