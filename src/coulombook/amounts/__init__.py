"""Room: amounts."""
