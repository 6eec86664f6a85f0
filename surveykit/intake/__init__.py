"""Intake: parameter files, field sheet and raw logs -> records in UTC and SI, matched to passes."""
