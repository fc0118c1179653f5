"""Materials: laws, spreads, and the files they are read from."""
