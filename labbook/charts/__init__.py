"""frames in, Altair charts out."""
