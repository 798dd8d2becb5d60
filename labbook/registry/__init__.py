"""the vocabulary: quantities, numbers, dialects, regimes, and how text becomes a value."""
