"""facts in bulk: sheets in, tables out."""
