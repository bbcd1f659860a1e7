"""Judgement on one plan: precedents, estimate, findings, advice."""
