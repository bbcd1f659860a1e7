"""The terminal interface: shows what `kb.book` answers. No chemistry, no SQL."""
