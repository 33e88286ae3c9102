"""The study: a TOML file, checked completely, as the objects the other rooms work with."""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from pathlib import Path as FilePath
from typing import Any, TypeVar, cast

from evaluators.interface import installed
from evaluators.machine.cost import Prices
from evaluators.machine.demagnetisation import Fault
from evaluators.machine.materials import library as materials
from evaluators.machine.task.cooling import Cooling
from evaluators.machine.task.rotor_layout import RotorLayout
from evaluators.machine.task.task import (
    Conditions,
    Construction,
    Duty,
    MaterialSet,
    RippleWeights,
    Task,
)
from evaluators.machine.winding.families import Refusal
from evaluators.machine.winding.winding import Winding
from studies.errors import Finding, StudyFileError, quoted
from studies.study_file import convert
from studies.study_file.crosschecks import (
    Bounds,
    Limit,
    Objective,
    check_bounds,
    check_description,
    check_limits,
    check_material,
    check_name,
    check_objectives,
    check_search,
)
from studies.study_file.family_choice import FamilyChoice, check_families
from studies.study_file.positions import Positions, line_of
from studies.study_file.price_list import check_prices
from studies.study_file.reading import Table, parse, read_bytes
from studies.study_file.schema import (
    FREE_SECTIONS,
    OPTIONAL_SECTIONS,
    REQUIRED_SECTIONS,
    SIMPLE_SECTIONS,
    ConditionsSection,
    ConstructionSection,
    DutySection,
    EvaluatorSection,
    MaterialsSection,
    RippleSection,
    SearchSection,
    StudySection,
)
from studies.study_file.schema_base import Section
from studies.study_file.schema_machine import CoolingSection, FaultSection, GasSection, RotorSection
from studies.study_file.sections import Model, validated
from studies.suggestions import suggest, unknown

Built = TypeVar("Built")
SECTIONS = (*SIMPLE_SECTIONS, *OPTIONAL_SECTIONS, *FREE_SECTIONS)


@dataclass(frozen=True)
class Study:
    """A checked study.

    Attributes
    ----------
    name, description : str
    file : str
        Where it was read, as shown in messages.
    content : bytes
        The file as it was read.
    duty, conditions, construction, materials, prices, ripple, cooling, rotor, fault
        As `evaluators.machine.task.task.Task` takes them, SI.
    windings : tuple of Winding
        One for each family, in the order of the file.
    refused : tuple of Refusal
        Combinations of the rule that cannot be wound.
    bounds : mapping of family id to mapping of variable to (low, high)
        In the units of the names; equal where fixed.
    limits, objectives
    search : SearchSection
    evaluator : EvaluatorSection
    """

    name: str
    description: str
    file: str
    content: bytes
    duty: Duty
    conditions: Conditions
    construction: Construction
    materials: MaterialSet
    prices: Prices
    ripple: RippleWeights
    cooling: Cooling
    rotor: RotorLayout
    fault: Fault
    windings: tuple[Winding, ...]
    refused: tuple[Refusal, ...]
    bounds: Mapping[str, Mapping[str, Bounds]]
    limits: tuple[Limit, ...]
    objectives: tuple[Objective, ...]
    search: SearchSection
    evaluator: EvaluatorSection

    @property
    def digest(self) -> str:
        """SHA-256 of the file's content."""
        return hashlib.sha256(self.content).hexdigest()

    @property
    def families(self) -> tuple[str, ...]:
        """Ids of the families, in the order of the file."""
        return tuple(winding.family.id for winding in self.windings)

    def winding(self, family: str) -> Winding:
        """Winding of the family with this id."""
        return self.windings[self.families.index(family)]

    def task(self, family: str) -> Task:
        """What the evaluator is built for."""
        return Task(
            winding=self.winding(family),
            duty=self.duty,
            materials=self.materials,
            prices=self.prices,
            conditions=self.conditions,
            construction=self.construction,
            ripple=self.ripple,
            cooling=self.cooling,
            rotor=self.rotor,
            fault=self.fault,
        )


def load_study(file: FilePath) -> Study:
    """Read and check a study file.

    Raises
    ------
    StudiesError
        If the file cannot be read; `StudyFileError` with every mistake found if it is wrong.
    """
    return study_from(read_bytes(file), str(file))


def study_from(content: bytes, file: str, stored: bool = False) -> Study:
    """Check the content of a study file.

    Parameters
    ----------
    content : bytes
    file : str
        Name used in messages.
    stored : bool
        Whether it is the copy in a results folder, which can be read without its evaluator.

    Raises
    ------
    StudyFileError
        With every mistake found.
    """
    table, lines = parse(content, file)
    return _Reader(table, lines, file, stored).study(content)


class _Reader:
    """Collects findings while the sections are read one by one."""

    def __init__(self, table: Table, lines: Positions, file: str, stored: bool) -> None:
        self.table = table
        self.lines = lines
        self.file = file
        self.stored = stored
        self.findings: list[Finding] = []

    def study(self, content: bytes) -> Study:
        for key, value in self.table.items():
            if key not in SECTIONS:
                problem = f"{unknown('section', key)} (got {quoted(value)})"
                self.findings.append(Finding((key,), problem, suggest(key, SECTIONS)))
        for key in REQUIRED_SECTIONS:
            if key not in self.table:
                remedy = f"add [{key}]; `hovergap new` writes a complete study"
                if key == "objectives":
                    remedy = 'add [[objectives]] with metric = "..." for each objective'
                self.findings.append(Finding((key,), "this section is missing", remedy))
        head = self._section("study", StudySection)
        if head:
            self.findings += check_name(head.name)
            self.findings += check_description(head.description)
        duty = self._built(convert.duty, self._section("duty", DutySection), "duty")
        conditions = self._built(
            convert.conditions, self._section("conditions", ConditionsSection), "conditions"
        )
        construction = self._built(
            convert.construction, self._section("construction", ConstructionSection), "construction"
        )
        ripple = self._built(
            convert.ripple, self._section("ripple_index", RippleSection), "ripple_index"
        )
        cooling = self._built(convert.cooling, self._section("cooling", CoolingSection), "cooling")
        rotor = self._built(convert.rotor, self._section("rotor", RotorSection), "rotor")
        fault = self._built(convert.fault, self._section("fault", FaultSection), "fault")
        chosen = self._with_stated_gas(
            self._materials(self._section("materials", MaterialsSection))
        )
        prices = self._prices()
        search = self._section("search", SearchSection)
        evaluator = self._evaluator(self._section("evaluator", EvaluatorSection))
        families = self._families()
        self.findings += check_search(self.table.get("search"), len(families.windings))
        bounds = self._bounds(families)
        limits = self._limits()
        objectives: tuple[Objective, ...] = ()
        if "objectives" in self.table:
            objectives, wrong = check_objectives(self.table["objectives"])
            self.findings += wrong
        if self.findings:
            raise StudyFileError(self.file, self._placed())
        head = cast("StudySection", head)
        study = Study(
            name=head.name,
            description=head.description,
            file=self.file,
            content=content,
            duty=cast("Duty", duty),
            conditions=cast("Conditions", conditions),
            construction=cast("Construction", construction),
            materials=cast("MaterialSet", chosen),
            prices=cast("Prices", prices),
            ripple=cast("RippleWeights", ripple),
            cooling=cast("Cooling", cooling),
            rotor=cast("RotorLayout", rotor),
            fault=cast("Fault", fault),
            windings=families.windings,
            refused=families.refused,
            bounds=bounds,
            limits=limits,
            objectives=objectives,
            search=cast("SearchSection", search),
            evaluator=cast("EvaluatorSection", evaluator),
        )
        self._fitting_together(study)
        return study

    def _fitting_together(self, study: Study) -> None:
        """Let the machine's room check what it checks across sections."""
        try:
            for family in study.families:
                study.task(family)
        except ValueError as error:
            self.findings.append(self._spoken(str(error)))
            raise StudyFileError(self.file, self._placed()) from None

    def _spoken(self, text: str, key: str = "") -> Finding:
        """A finding from a text such as ``duty: speed = ... must ...``."""
        owner, colon, rest = text.partition(": ")
        if colon and owner in SECTIONS:
            return Finding((owner,), rest)
        return Finding((key,) if key else (), text)

    def _placed(self) -> list[Finding]:
        placed = [
            Finding(item.path, item.problem, item.remedy, line_of(self.lines, item.path))
            for item in self.findings
        ]
        return sorted(placed, key=lambda item: item.line or 0)

    def _section(self, key: str, model: type[Model]) -> Model | None:
        if key not in self.table and key in REQUIRED_SECTIONS:
            return None
        found, wrong = validated(model, self.table.get(key, {}), (key,))
        self.findings += wrong
        return found

    def _built(
        self, builder: Callable[[Any], Built], section: Section | None, key: str
    ) -> Built | None:
        """Build what the machine's room wants; its own checks speak in its own words."""
        if section is None:
            return None
        try:
            return builder(section)
        except ValueError as error:
            self.findings.append(self._spoken(str(error), key))
            return None

    def _materials(self, section: MaterialsSection | None) -> MaterialSet | None:
        if section is None:
            return None
        wrong = [
            finding
            for key, kind in convert.MATERIAL_KINDS.items()
            for finding in check_material(
                kind, getattr(section, key), materials.available(kind), key
            )
        ]
        self.findings += wrong
        return None if wrong else convert.material_set(section)

    def _with_stated_gas(self, chosen: MaterialSet | None) -> MaterialSet | None:
        """The materials with the gas that section ``gas`` describes, if there is one."""
        if "gas" not in self.table:
            return chosen
        named = self.table.get("materials")
        if isinstance(named, dict) and "gas" in named:
            remedy = "leave out one of the two"
            problem = "the gas is named here and described in [gas]"
            self.findings.append(Finding(("materials", "gas"), problem, remedy))
        gas = self._built(convert.stated_gas, self._section("gas", GasSection), "gas")
        return replace(chosen, gas=gas) if chosen and gas else None

    def _prices(self) -> Prices | None:
        if "prices" not in self.table:
            return None
        prices, wrong = check_prices(self.table["prices"])
        self.findings += wrong
        return prices

    def _evaluator(self, section: EvaluatorSection | None) -> EvaluatorSection | None:
        if section is None:
            return None
        known = sorted(installed())
        if section.name not in known and not self.stored:
            problem = unknown("evaluator", section.name)
            remedy = suggest(section.name, known) if known else "none is installed"
            self.findings.append(Finding(("evaluator", "name"), problem, remedy))
        return section

    def _families(self) -> FamilyChoice:
        if "families" not in self.table:
            return FamilyChoice((), (), {})
        families, wrong = check_families(self.table["families"])
        self.findings += wrong
        return families

    def _bounds(self, families: FamilyChoice) -> dict[str, dict[str, Bounds]]:
        table = self.table.get("variables")
        if not isinstance(table, dict):
            if table is not None:
                problem = f"must be a table (got {quoted(table)})"
                self.findings.append(Finding(("variables",), problem, "write [variables] above"))
            return {}
        common, wrong = check_bounds(table, ("variables",), required=True)
        self.findings += wrong
        bounds = {
            winding.family.id: {**common, **families.bounds.get(winding.family.id, {})}
            for winding in families.windings
        }
        for family, entry in bounds.items():
            if not wrong and all(low == high for low, high in entry.values()):
                problem = f"every variable of {family} is fixed, so there is nothing to search"
                self.findings.append(
                    Finding(("variables",), problem, "give at least one variable [low, high]")
                )
                break
        return bounds

    def _limits(self) -> tuple[Limit, ...]:
        table = self.table.get("limits", {})
        if not isinstance(table, dict):
            problem = f"must be a table (got {quoted(table)})"
            self.findings.append(Finding(("limits",), problem, "write [limits] above its keys"))
            return ()
        limits, wrong = check_limits(table)
        self.findings += wrong
        return limits
