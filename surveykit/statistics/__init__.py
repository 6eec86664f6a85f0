"""Statistics on plain arrays: correlated series, pooled passes, shared draws and verdicts."""
