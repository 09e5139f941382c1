"""Judgments of soil by dated, cited rule sets."""
