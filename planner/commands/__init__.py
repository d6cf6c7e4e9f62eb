"""One command a question."""
