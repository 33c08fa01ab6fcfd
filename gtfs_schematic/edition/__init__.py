"""Saving and loading issued diagrams."""
