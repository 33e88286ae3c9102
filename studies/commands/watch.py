"""``hovergap watch``: a sweep of another process, live."""

from __future__ import annotations

import click

PLAIN_INTERVAL_S = 5.0  # lines in a pipe or log
GRACE_S = 3.0  # a sweep may end one process and start the next


@click.command()
@click.argument("results_folder", metavar="RESULTS/STUDY", type=click.Path())
@click.option(
    "--interval",
    type=click.FloatRange(0.1, 3600.0),
    help="Seconds between two looks; by default 1 on a terminal, 5 in a pipe.",
)
@click.option("--wait", is_flag=True, help="Wait for a sweep that has not begun yet.")
@click.option("--once", is_flag=True, help="Look once and end.")
def watch(results_folder: str, interval: float | None, wait: bool, once: bool) -> None:
    """Watch a sweep that runs in another process.

    Ends with it, or at Ctrl-C. Only reads: the sweep is not held up, and goes on when this ends.
    """
    import time
    from pathlib import Path

    from studies.running.screen import Screen
    from studies.running.watching import StudyWatch, writer_of
    from studies.stored.layout import STUDY_FILE, open_results

    screen = Screen()
    pause = interval or (1.0 if screen.live else PLAIN_INTERVAL_S)
    folder = Path(results_folder)
    try:
        while wait and not (folder / STUDY_FILE).is_file():
            time.sleep(pause)
        state = StudyWatch.of(open_results(folder))
        seen = False
        idle_since = time.monotonic()
        while True:
            writer = writer_of(folder)
            if writer:
                seen, idle_since = True, time.monotonic()
                state.follow(open_results(folder))  # `resume` may have raised what is wanted
            state.refresh()
            at_work = f"searched by {writer}" if writer else "not being searched"
            screen.show([f"{state.results.study.name}: {at_work}", *state.lines(screen.width)])
            idle = time.monotonic() - idle_since
            if once or (not writer and not (wait and not seen) and (idle > GRACE_S or not seen)):
                break
            if not writer and state.complete:
                break
            time.sleep(min(pause, GRACE_S) if not writer else pause)
    except KeyboardInterrupt:
        click.echo("\nno longer watching; a sweep in another process goes on")
        return
    if state.complete:
        click.echo("every family is complete")
    elif not writer:
        click.echo(f"not complete; go on with: hovergap resume {folder}")
