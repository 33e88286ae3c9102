"""The user's own field solver behind the interface."""

from __future__ import annotations

import shutil
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from evaluators.batching import Batch
from evaluators.external.licences import licence
from evaluators.external.process import Ended, run_program
from evaluators.external.quantities import FIELD
from evaluators.external.reply import Reply, ReplyError, read_reply, reply_bytes
from evaluators.external.request import request_files
from evaluators.external.settings import read_settings
from evaluators.external.wording import LONGEST_REASON, plain, quoted
from evaluators.external.workplace import Workplace, folder_name
from evaluators.interface import (
    Capability,
    ConsentError,
    Evaluations,
    EvaluatorError,
    Status,
    Waveform,
)
from evaluators.machine.field import Excitation, FieldSolution
from evaluators.machine.geometry.cross_sections import CrossSections
from evaluators.machine.geometry.variables import VARIABLE_NAMES
from evaluators.machine.metrics import METRICS
from evaluators.machine.performance import performance
from evaluators.machine.task.task import Task

FloatArray = NDArray[np.float64]

EXCHANGE_VERSION = "1"
REQUEST, REPLY = "request.json", "reply.json"


class _RunError(Exception):
    """One run came to nothing; `again` says whether another may do better."""

    def __init__(self, reason: str, status: Status = Status.FAILED, again: bool = True) -> None:
        super().__init__(plain(reason, LONGEST_REASON))
        self.status = status
        self.again = again


class ExternalEvaluator:
    """One run of the program for each design; see ``EXCHANGE.md``.

    Settings: the fields of `evaluators.external.settings.ExternalSettings`. Nothing is started
    and nothing written before `allow_program` is called.
    """

    name = "external"
    capabilities: frozenset[Capability] = frozenset()

    def __init__(self, task: Task, settings: Mapping[str, object] | None = None) -> None:
        self.task = task
        self.settings = read_settings(settings or {})
        own = self.settings.version
        self.version = f"{EXCHANGE_VERSION} {own}".rstrip()
        self._workplace = Workplace(self.settings)
        self._path = ""

    @property
    def metrics(self) -> tuple[str, ...]:
        """All metrics of the registry if the program returns the field, else those it returns."""
        if self.settings.field:
            return tuple(metric.name for metric in METRICS)
        return self.settings.metrics

    @property
    def program(self) -> tuple[str, ...]:
        """The program and its arguments."""
        return self.settings.program

    def allow_program(self) -> None:
        """Give consent to start the program.

        Raises
        ------
        EvaluatorError
            If there is no such program.
        """
        found = shutil.which(self.program[0])
        if found is None:
            msg = (
                f"setting program: {quoted(self.program[0])} is neither a program on the path nor "
                "an executable file"
            )
            raise EvaluatorError(msg)
        # It runs in another folder, where a relative path would mean something else.
        self._path = str(Path(found).absolute())

    def evaluate(self, designs: Mapping[str, FloatArray]) -> Evaluations:
        """Evaluate n designs one after the other; see `evaluators.interface`.

        Raises
        ------
        ConsentError
            If `allow_program` was not called.
        """
        batch = Batch(self.task, designs, self.metrics)
        if not self._path:
            msg = f"the program {quoted(self.program[0])} may not be started without consent"
            raise ConsentError(msg)
        replies: dict[int, Reply] = {}  # by place among the cross-sections
        for place, row in enumerate(batch.valid.tolist()):
            values = {name: float(designs[name][row]) for name in VARIABLE_NAMES}
            try:
                replies[place] = self._reply(batch.sections, batch.exciting, place, values)
            except _RunError as error:
                batch.fail(place, str(error), error.status)
        if replies:
            solved = np.array(list(replies), dtype=np.int64)
            columns, reasons = self._columns(
                batch.sections, batch.exciting, solved, list(replies.values())
            )
            batch.settle(solved, columns, reasons)
        return batch.evaluations()

    def waveforms(self, design: Mapping[str, float]) -> tuple[Waveform, ...]:
        """None: the exchange does not carry them."""
        del design
        return ()

    def _columns(
        self,
        sections: CrossSections,
        exciting: Excitation,
        solved: NDArray[np.int64],
        replies: list[Reply],
    ) -> tuple[dict[str, FloatArray], NDArray[np.object_]]:
        """Metrics (k,) and reasons (k,) of the designs that were answered."""
        words = np.full(solved.size, "", dtype=object)
        columns: dict[str, FloatArray] = {}
        if self.settings.field:
            field = FieldSolution(
                **{
                    item.attribute: np.array([reply.field[item.attribute] for reply in replies])
                    for item in FIELD
                }
            )
            current = exciting.rows(solved)
            # Numbers within their ranges can still make no machine together; that is a row.
            with np.errstate(all="ignore"):
                done = performance(self.task, sections.rows(solved), current, field)
            columns |= {name: np.array(done.metrics[name]) for name in self.metrics}
            words[:] = done.reasons
        for name in self.settings.metrics:
            columns[name] = np.array([reply.metrics[name] for reply in replies])
        return columns, words

    def _reply(
        self, sections: CrossSections, exciting: Excitation, position: int, values: dict[str, float]
    ) -> Reply:
        """Reply for one design, after as many runs as are allowed."""
        settings = self.settings
        files = request_files(
            self.task,
            sections,
            exciting,
            position,
            values,
            settings.field,
            settings.metrics,
            settings.drawing,
        )
        for _ in range(settings.retries):
            try:
                return self._run(files)
            except _RunError as error:
                if not error.again:
                    raise
        return self._run(files)

    def _run(self, files: Mapping[str, bytes]) -> Reply:
        """One run in a folder of its own."""
        try:
            with licence(self._path, self.settings.concurrency):
                folder = self._workplace.open(files)
                reason = "stopped from outside"
                try:
                    ended = run_program(
                        (self._path, *self.program[1:]), folder, self.settings.timeout_s
                    )
                    reply = self._checked(ended, folder)
                    reason = ""
                    return reply
                except _RunError as error:
                    reason = str(error)
                    raise
                finally:
                    self._workplace.close(folder, folder_name(files[REQUEST]), reason)
        except OSError as error:
            place = f"{error.filename}: " if error.filename else ""
            reason = (
                f"the program could not be run: {place}{(error.strerror or str(error)).lower()}"
            )
            raise _RunError(reason) from None

    def _checked(self, ended: Ended, folder: Path) -> Reply:
        """Reply of a run that ended."""
        name = Path(self._path).name
        said = f'; its last words: "{ended.last_words}"' if ended.last_words else ""
        if ended.how == "timed out":
            reason = f"{name} was stopped at its time limit of {self.settings.timeout_s:g} s{said}"
            raise _RunError(reason, Status.TIMED_OUT, again=False)
        if ended.how == "not started":
            reason = f"{name} could not be started: {ended.last_words}"
            raise _RunError(reason)
        if ended.how == "too much output":
            reason = f"{name} was stopped because it printed too much{said}"
            raise _RunError(reason, again=False)
        if ended.code != 0:
            how = f"exit code {ended.code}" if ended.code > 0 else f"signal {-ended.code}"
            reason = f"{name} ended with {how}{said}"
            raise _RunError(reason)
        try:
            reply = read_reply(
                reply_bytes(folder / REPLY), self.settings.field, self.settings.metrics
            )
        except ReplyError as error:
            reason = f"{name} {error}{said}"
            raise _RunError(reason) from None
        if reply.reason:
            raise _RunError(reply.reason, again=False)
        return reply
