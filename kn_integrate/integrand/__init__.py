"""Integrands: their algebra, and reading them from text."""

from .algebra import MAX_POWER, Integrand, Powers, Term, monomial, parke_taylor
from .text import parse_integrand

__all__ = ["MAX_POWER", "Integrand", "Powers", "Term", "monomial", "parke_taylor", "parse_integrand"]
