"""Areal rainfall from rain gauges."""
