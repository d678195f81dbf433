"""Checks of the generated C that share nothing with its derivation."""
