"""Structures to facts: reading schemes, centres, screens and drawings. No record, no conditions."""
