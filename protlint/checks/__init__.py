"""The checks: one question each, put to a limiter."""
