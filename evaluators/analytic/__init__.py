"""Screening evaluator: closed-form fields of the slotted gap, all designs of a batch at once."""
