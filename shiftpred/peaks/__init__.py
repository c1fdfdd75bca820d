"""Read peak lists; solvent and impurity lines."""
