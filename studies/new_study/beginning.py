"""A new study file sized from power, speed and DC link."""

from __future__ import annotations

from pathlib import Path

from studies.errors import StudiesError, StudyFileError
from studies.new_study.template import study_text
from studies.study_file.crosschecks import check_name
from studies.study_file.definition import Study, study_from


def begin_study(
    file: Path, power: float, speed: float, dc_link: float, overspeed: float, orientation: str
) -> Study:
    """Write a commented study file that is not there yet.

    Parameters
    ----------
    file : Path
        Its name without ``.toml`` names the study.
    power, speed, dc_link, overspeed : float
        kW, r/min, V, and the ratio to the speed.
    orientation : str
        ``horizontal`` or ``vertical``.

    Raises
    ------
    StudiesError
        If the name will not do, the file is there already, or no sensible machine comes out.
    """
    name = file.name.removesuffix(".toml")
    wrong = check_name(name)
    if wrong or file.suffix != ".toml":
        problem = wrong[0].problem if wrong else "has no .toml ending"
        msg = (
            f"{str(file)!r}: the file name, which names the study, {problem}; write for example "
            "blower.toml"
        )
        raise StudiesError(msg)
    text = study_text(name, power, speed, dc_link, overspeed, orientation)
    try:
        study = study_from(text.encode(), str(file))
    except StudyFileError as error:
        msg = (
            f"no sensible machine of {power:g} kW at {speed:g} r/min came out of the first-order "
            f"sizing:\n{error}"
        )
        raise StudiesError(msg) from None
    try:
        with file.open("x", encoding="utf-8") as stream:
            stream.write(text)
    except FileExistsError:
        msg = f"{file}: exists already and is left alone; choose another name"
        raise StudiesError(msg) from None
    except FileNotFoundError:
        msg = f"{file}: there is no folder {file.parent}; make it first"
        raise StudiesError(msg) from None
    return study
