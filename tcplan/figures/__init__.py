"""Figures of a plan; each draws on the axes it is given, returns its artists and decides nothing."""
