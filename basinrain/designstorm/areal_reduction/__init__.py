"""Areal reduction."""
