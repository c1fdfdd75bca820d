"""Placeholder until the electronics room is there."""
