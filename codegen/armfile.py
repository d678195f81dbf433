"""The arm file reader: from a path to an exact `Arm` (contract, section 1).

One pass finds every fault of a file: a faulty value counts as missing and reading goes on. First the bytes, then TOML,
the [arm] table with the units, the joints and frames, and last what only the whole can tell (names that repeat, held
joints, the joint count that the task needs). Warnings are what a careful reader would ask about; they stop nothing.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path

from codegen.armfile_bytes import parse_toml, read_bytes
from codegen.armfile_keys import (
    ANGLE_UNITS,
    ARM,
    BASE,
    JOINT,
    LENGTH_UNITS,
    MOST_JOINTS,
    TABLES,
    TOOL,
    Table,
)
from codegen.armfile_names import closest, did_you_mean
from codegen.armfile_tasks import joint_count_fault
from codegen.armfile_values import Report, Section, Units, shown
from codegen.armfile_warnings import unit_warnings
from codegen.errors import ArmFileError, Fault
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Task

_MOST_FAULTS = 100


@dataclass(frozen=True, slots=True)
class ArmFile:
    """A good arm file: the arm, what looks doubtful in how it is typed, the SHA-256 of its bytes in hex, its path."""

    arm: Arm
    warnings: tuple[Fault, ...]
    digest: str
    path: str


def read_arm(path: Path) -> ArmFile:
    """Read an arm file. ArmFileError holds every fault that was found in it."""
    content = read_bytes(path)
    report = Report(str(path))
    arm = _arm(report, parse_toml(path, content))
    if report.faults:
        raise ArmFileError(*_not_too_many(report))
    return ArmFile(arm, unit_warnings(report.path, arm, report.typed), hashlib.sha256(content).hexdigest(), str(path))


def _not_too_many(report: Report) -> list[Fault]:
    more = len(report.faults) - _MOST_FAULTS
    rest = [Fault(report.path, f"{more} more faults")] if more > 0 else []
    return report.faults[:_MOST_FAULTS] + rest


def _arm(report: Report, document: dict[str, object]) -> Arm:
    """The arm; only good when the report stays without faults."""
    _check_tables(report, document)
    head = _section(report, ARM, document, Units())
    units = Units(LENGTH_UNITS[head.word("length_unit")], ANGLE_UNITS[head.word("angle_unit")])
    name, convention, task, held = head.identifier("name"), _convention(head), _task(head), head.labels("held")
    base = _frame(_section(report, BASE, document, units))
    rows = enumerate(_joint_sections(report, document, units), start=1)
    joints = tuple(_joint(section, number) for number, section in rows)
    arm = Arm(
        name=name,
        convention=convention,
        task=task or Task.POSE,
        joints=joints,
        held=held or (),
        base=base,
        tool=_frame(_section(report, TOOL, document, units)),
        length_unit=units.length.word,
        angle_unit=units.angle.word,
    )
    _check_repeated_names(report, arm)
    held_is_good = held is not None and _check_held(head, arm)
    if task and held_is_good and 1 <= len(joints) <= MOST_JOINTS:
        report.faults.extend(joint_count_fault(report.path, arm))
    return arm


# --- tables and keys ---


def _check_tables(report: Report, document: dict[str, object]) -> None:
    names = [table.name for table in TABLES]
    for name in document:
        if name not in names:
            report.add(
                "", f"unknown {_sort(document[name])} {shown(name)}", _hint_for_unknown(name, document[name], names)
            )
    unknown = [name for name in document if name not in names]
    for table in TABLES:
        if table.required and table.name not in document and not _misspelt(table.name, unknown, names):
            report.add("", f"the table {table.heading} is missing", f"{table.heading} holds {table.meaning}")


def _sort(value: object) -> str:
    return "table" if isinstance(value, dict) or _is_tables(value) else "key"


def _is_tables(value: object) -> bool:
    return isinstance(value, list) and bool(value) and all(isinstance(item, dict) for item in value)


def _hint_for_unknown(name: str, value: object, accepted: list[str]) -> str:
    """The spelling that was meant, the table where the key belongs, or all that is accepted."""
    homes = [table.heading for table in TABLES if any(key.name == name for key in table.keys)]
    if homes and not isinstance(value, dict):
        return f"it belongs under {' or '.join(homes)}"
    return did_you_mean(name, accepted) or f"accepted are {', '.join(sorted(accepted))}"


def _misspelt(name: str, unknown: list[str], accepted: list[str]) -> bool:
    """Whether one of the unknown names was surely meant for `name`: then its absence is not reported as well."""
    return any(closest(word, accepted) == name for word in unknown)


def _section(report: Report, table: Table, document: dict[str, object], units: Units) -> Section:
    """The one table of that name, checked for unknown and missing keys; empty when there is none."""
    value = document.get(table.name, {})
    if not isinstance(value, dict):
        hint = f"write {table.heading} above its keys" + (", once" if _is_tables(value) else "")
        report.add(table.heading, f"{shown(value)} stands where a table is accepted", hint)
        return Section(report, table.heading, table, {}, units)
    section = Section(report, table.heading, table, value, units)
    if table.name in document:
        _check_keys(section)
    return section


def _joint_sections(report: Report, document: dict[str, object], units: Units) -> list[Section]:
    rows = document.get(JOINT.name, [])
    if isinstance(rows, dict) or (rows and not _is_tables(rows)) or not isinstance(rows, list):
        report.add("[joint]", "joints are not a list of tables", "begin each joint with [[joint]], in double brackets")
        return []
    if JOINT.name in document and not rows:
        report.add("", "there is no joint", f"an arm has 1 to {MOST_JOINTS}")
    if len(rows) > MOST_JOINTS:
        report.add("", f"{len(rows)} joints; 1 to {MOST_JOINTS} are accepted")
    return [Section(report, _place(row, number), JOINT, row, units) for number, row in enumerate(rows, start=1)]


def _place(row: dict[str, object], number: int) -> str:
    name = row.get("name")
    return f"joint {number} ({shown(name)})" if isinstance(name, str) and name else f"joint {number}"


def _check_keys(section: Section) -> None:
    accepted = [key.name for key in section.table.keys]
    unknown = [name for name in section.values if name not in accepted]
    for name in unknown:
        hint = _hint_for_unknown(name, section.values[name], accepted)
        section.report.add(section.place, f"unknown key {shown(name)}", hint)
    for key in section.table.keys:
        if key.required and key.name not in section.values and not _misspelt(key.name, unknown, accepted):
            choices = f": {' or '.join(shown(choice) for choice in sorted(key.choices))}" if key.choices else ""
            section.fault(key.name, "is missing", f"{key.meaning}{choices}")


# --- contents ---


def _convention(head: Section) -> Convention:
    word = head.word("convention")
    return Convention(word) if word else Convention.STANDARD


def _task(head: Section) -> Task | None:
    word = head.word("task")
    return next((task for task in Task if task.key == word), None)


def _frame(section: Section) -> Frame:
    return Frame(section.lengths("xyz"), section.angles("rpy"))


def _joint(section: Section, number: int) -> JointRow:
    _check_keys(section)
    word = section.word("type")
    kind = JointKind(word) if word else None
    return JointRow(
        name=section.label("name") or f"joint{number}",
        kind=kind or JointKind.REVOLUTE,
        a=section.length("a"),
        alpha=section.angle("alpha"),
        d=section.length("d"),
        theta=section.angle("theta"),
        limits=section.limits(kind) if kind else None,  # their unit is not known without the kind
        max_speed=section.max_speed(kind) if kind else None,
    )


# --- what only the whole can tell ---


def _check_repeated_names(report: Report, arm: Arm) -> None:
    names = [row.name for row in arm.joints]
    for number, name in enumerate(names, start=1):
        first = names.index(name) + 1
        if first < number:
            report.add(
                f"joint {number} ({shown(name)})", f"has the name of joint {first}", "give every joint its own name"
            )


def _check_held(head: Section, arm: Arm) -> bool:
    """Report what is wrong with the names in `held`; whether all of them are good."""
    names = [row.name for row in arm.joints]
    unknown = [name for name in arm.held if name not in names]
    repeated = sorted({name for name in arm.held if arm.held.count(name) > 1})
    for name in unknown:
        hint = did_you_mean(name, names) or f"the joints are {', '.join(shown(name) for name in names)}"
        head.fault("held:", f"no joint is named {shown(name)}", hint if names else "")
    for name in repeated:
        head.fault("held:", f"{shown(name)} stands more than once", "list it once")
    return not unknown and not repeated
