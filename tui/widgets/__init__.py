"""One file per thing shown."""
