"""From a proposal to a checked option, by other means than the search used."""
