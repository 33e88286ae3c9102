"""``python -m studies`` is the command ``hovergap``."""

from studies.cli import main

main(prog_name="hovergap")
