"""Tangentbook: linear models of nonlinear plants, computed, checked and written up."""

from tangentbook._version import __version__ as __version__

__all__ = ["__version__"]
