"""Dictionaries → plain text for a terminal."""
