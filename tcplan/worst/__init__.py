"""The worst case of a network over the spread of its materials, reached by a named device and bounded."""
