"""From records to numbers: pass estimates, surfaces with uncertainty, differences, changes."""
