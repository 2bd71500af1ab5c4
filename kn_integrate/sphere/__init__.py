"""Sphere integrals: over complex planes directly, and through bilinears of disk integrals."""
