"""The winding of a family, and which families have one."""
