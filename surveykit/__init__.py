"""From a day's logger files and a field sheet to per-surface numbers with uncertainty."""
