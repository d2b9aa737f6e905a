"""Plots, from plain data."""
