"""Vocabulary of the tables: every column once, the layouts made of them, and what readers hand over."""
