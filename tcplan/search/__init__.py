"""The search for networks. What it finds are proposals; ``verify`` makes options of them."""
