"""Which half forms which face, where the halves meet, and the two halves themselves."""
