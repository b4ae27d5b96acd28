"""What the user may write: the schema of the spec, its loader with line numbers, and its description."""
