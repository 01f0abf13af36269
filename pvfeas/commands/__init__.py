"""The commands: load, call, render, write."""
