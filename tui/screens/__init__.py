"""One file per place."""
