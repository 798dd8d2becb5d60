"""the one place that reads and writes a book."""
