"""The questions: functions from a problem to a result."""
