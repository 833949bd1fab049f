"""Thalweg: ground-state energy studies of small molecules and spin models with variational quantum circuits."""

__version__ = "0.1.0"
