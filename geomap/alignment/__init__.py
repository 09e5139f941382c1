"""The alignment: its line, its chainage, places beside it, and levels along it."""
