"""Results as text, JSON and CSV, and writing them safely."""
