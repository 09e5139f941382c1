"""Reads the judged ensemble along the line: cells, steps and what they add up to."""
