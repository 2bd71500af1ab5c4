"""Figures for papers, each made from data that can be had without drawing: amplitudes, poles, errors, convergence."""
