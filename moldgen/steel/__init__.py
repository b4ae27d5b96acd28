"""Steel: pins, bores and the feed, cut into the two halves."""
