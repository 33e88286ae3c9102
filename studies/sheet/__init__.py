"""The design sheet: one chosen design on paper, with what a colleague needs to check it by hand."""
