"""Trained models on disk: manifest, arrays, checks. Nothing is ever unpickled."""

from shiftpred.bundles.model_bundle import ModelBundle, load_bundle, load_default_bundle, save_bundle, save_judgement

__all__ = ["ModelBundle", "load_bundle", "load_default_bundle", "save_bundle", "save_judgement"]
