"""The record as a whole: recurring failures, replay, coverage, calibration."""
