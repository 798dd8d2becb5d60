"""pages: widgets, one call, a drawing; no rules."""
