"""Figures: pure functions from curves to a figure; saving is elsewhere."""
