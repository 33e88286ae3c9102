"""Assembly and solution of the field equations of many designs at once."""
