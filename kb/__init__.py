"""Sidepath's knowledge base: the record of runs and the judgement drawn from it, without any front end."""
