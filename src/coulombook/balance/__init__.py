"""Room: balance."""
