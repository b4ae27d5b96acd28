"""Two versions of a part and its tool, laid onto each other."""
