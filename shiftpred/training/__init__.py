"""Offline only: from tables of structures and peaks without atom numbers to a trained model. Prediction never imports it."""
