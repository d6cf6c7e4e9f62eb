"""One page a question."""
