"""How far the evaluators agree: ``python -m studies.agreement``."""
