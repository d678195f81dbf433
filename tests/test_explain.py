"""`linkwright explain`: its formulas are carried out as they stand, and must reach the poses that the link table gives.

The reader below knows the document's small language only; it shares nothing with what printed it.
"""

from __future__ import annotations

import itertools
import math
import re
from functools import cache
from pathlib import Path

import numpy as np
import pytest
from arms_random import (
    AXIS_ARMS,
    HELD_ARMS,
    PITCH_ARMS,
    PLANE_ARMS,
    POINT_ARMS,
    POSE_ARMS,
    YAW_ARMS,
    Structure,
    random_arm,
)
from command_line import CANNOT_REACH, PICKER, call, names_in
from generated import kinematics
from link_tables import MANSEUR_DOTY

from build_checks.reference import Array, Poses, Reference
from build_checks.reference_task import TaskReading
from codegen.armfile import ArmFile, read_arm
from codegen.armwriter import arm_file_text
from codegen.explain import explanation
from codegen.inverse.tasks import derive
from codegen.model import Arm
from codegen.places import ARMS

LENGTH, ANGLE = 1e-9, 1e-9  # of the reach; rad. Double rounding, and Newton's steps where a search stands for the C's


@cache
def text_of(arm: Arm) -> str:
    return explanation(ArmFile(arm, (), "0" * 64, "arm.toml"), "arm.toml")


def section(text: str, heading: str) -> str:
    return re.search(rf"^## {heading}$(.*?)(?=^## |\Z)", text, re.MULTILINE | re.DOTALL)[1]  # type: ignore[index]


def step_sections(text: str) -> list[str]:
    return re.split(r"^### ", section(text, "Inverse kinematics"), flags=re.MULTILINE)[1:]


def blocks(text: str) -> list[list[str]]:
    """Every block of formulas as whole lines: continued ones joined, notes dropped."""
    found = []
    for block in re.findall(r"^```text\n(.*?)^```$", text, re.MULTILINE | re.DOTALL):
        lines: list[str] = []
        for line in block.splitlines():
            bare = line.split("#")[0].rstrip()
            if line.startswith("    "):
                lines[-1] += " " + bare.strip()
            elif bare:
                lines.append(bare)
        found.append(lines)
    return found


class Values:
    """The values named so far; `run` carries out one line."""

    def __init__(self, known: dict[str, float]) -> None:
        self.known = dict(known)

    @staticmethod
    def _identifier(name: str) -> str:
        return re.sub(r"\W", "_", name.strip())

    def value(self, expression: str) -> float:
        python = re.sub(r"([A-Za-z_][\w.]*(?:\[\w\])*)", lambda m: self._word(m[1]), expression).replace("^", "**")
        names = {"sqrt": math.sqrt, "abs": abs, "atan2": math.atan2, "__builtins__": {}}
        return float(eval(python, names, {self._identifier(k): v for k, v in self.known.items()}))

    def _word(self, word: str) -> str:
        return word if word in ("if", "else", "sqrt", "abs", "atan2") else self._identifier(word)

    def run(self, line: str, sign: float = 1.0) -> None:
        target, expression = line.split(" = ", 1)
        if pair := re.fullmatch(r"\((.*), (.*)\)", target):
            self._run_pair(pair[1], pair[2], expression)
        elif expression.startswith("+-"):
            self.known[target] = sign * self.value(expression.removeprefix("+-"))
        elif f"{expression}.c" in self.known:  # a whole pair
            self.known[f"{target}.c"], self.known[f"{target}.s"] = (self.known[f"{expression}.{k}"] for k in "cs")
        else:
            self.known[target] = self.value(expression)

    def _run_pair(self, cosine: str, sine: str, expression: str) -> None:
        if angle := re.fullmatch(r"cos_sin\((.*)\)", expression):
            turned = self.value(angle[1])
            self.known[cosine], self.known[sine] = math.cos(turned), math.sin(turned)
            return
        x, y, size = re.fullmatch(r"\((.*), (.*)\)/(sqrt\(.*\))", expression).groups()  # type: ignore[union-attr]
        length = self.value(size)
        self.known[cosine], self.known[sine] = self.value(x) / length, self.value(y) / length


def table_constants(arm: Arm) -> dict[str, float]:
    """The names of the document for the numbers of the table, from the table itself."""
    found: dict[str, float] = {}
    for number, row in enumerate(arm.joints, start=1):
        found[f"A{number}"], found[f"D{number}"] = float(row.a), float(row.d)
        for key in ("alpha", "theta"):
            _add_angle(found, f"{key.upper()}{number}", float(getattr(row, key).value()))
    for name, frame in (("BASE", arm.base), ("TOOL", arm.tool)):
        found.update(zip((f"{name}_X", f"{name}_Y", f"{name}_Z"), map(float, frame.xyz), strict=True))
        for key, angle in zip(("ROLL", "PITCH", "YAW"), frame.rpy, strict=True):
            _add_angle(found, f"{name}_{key}", float(angle.value()))
    return found


def _add_angle(found: dict[str, float], name: str, angle: float) -> None:
    found[name], found[f"COS_{name}"], found[f"SIN_{name}"] = angle, math.cos(angle), math.sin(angle)


def pose_values(pose: Poses) -> dict[str, float]:
    found = {f"p[{i}]": float(pose.position[0, i]) for i in range(3)}
    return found | {f"r[{i}][{j}]": float(pose.rotation[0, i, j]) for i in range(3) for j in range(3)}


# -- the inverse, carried out ------------------------------------------------------------------------------------------
class Search(Exception):
    """A choice without a root."""


class Inverse:
    """Carries out the steps of a document for one branch."""

    def __init__(self, arm: Arm, text: str) -> None:
        self.arm, self.steps = arm, [s for s in step_sections(text) if s.startswith("Step ")]

    @property
    def choices(self) -> list[int]:
        """How many roots each step with a choice has."""
        choosing = [step for step in self.steps if re.search(r"branch number|four roots", step)]
        return [4 if "of up to four roots" in step else 2 for step in choosing]

    def solve(self, pose: Poses, seed: Array, choice: tuple[int, ...]) -> Array:
        """Joint values; Search where a root does not exist."""
        values = Values(table_constants(self.arm) | pose_values(pose) | self._held(seed))
        left = list(choice)
        for step in self.steps:
            own = step.split("\nThere ")[0]  # what follows is for a joint that is free
            if "of up to four roots" in step:
                self._four(values, own, left.pop(0))
            elif "of Newton's steps" in step:
                self._newton(values, own)
            else:
                sign = (1.0, -1.0)[left.pop(0)] if "branch number" in step else 1.0
                self._lines(values, [line for block in blocks(own) for line in block], sign)
        q = seed.copy()
        for joint in self.arm.free_indices:
            q[joint] = values.known[f"q[{joint}]"]
        return q

    def _held(self, seed: Array) -> dict[str, float]:
        found = {}
        for joint in self.arm.held_indices:
            row, name = self.arm.joints[joint], self.arm.joints[joint].name
            right = row.theta.quarter_turns is not None
            angle = seed[joint] + (0.0 if right else float(row.theta.value()))
            found |= {f"{name}.c": math.cos(angle), f"{name}.s": math.sin(angle)}
            found[f"{name}_slide"] = seed[joint] + float(row.d)
        return found

    def _lines(self, values: Values, lines: list[str], sign: float) -> None:
        for line in lines:
            if line.endswith("_target") and "*" in line:
                continue  # the equation that the lines below it solve
            try:
                values.run(line, sign)
            except ValueError as error:
                raise Search from error

    def _four(self, values: Values, step: str, choice: int) -> None:
        shape, *formulas = blocks(step)
        for line in itertools.chain(*formulas):
            values.run(line)
        name = shape[0].split("_f0")[0]
        f = [values.known[f"{name}_f{k}"] for k in range(5)]
        roots = turn_roots(f) if "*s" in shape[0] else slide_roots(f)
        if choice >= len(roots):
            raise Search
        root = roots[choice]
        if f"{name}_det" in values.known:  # the side that the root lies on, by the slope there
            c, s = math.cos(root), math.sin(root)
            slope = -f[1] * s + f[2] * c - 2 * f[3] * c * s + f[4] * (c * c - s * s)
            values.known[f"{name}_side"] = math.copysign(1.0, slope * values.known[f"{name}_det"])
        if "*s" in shape[0]:
            values.known |= {f"{name}_rough.c": math.cos(root), f"{name}_rough.s": math.sin(root)}
        else:
            values.known[f"{name}_rough_slide"] = root

    def _newton(self, values: Values, step: str) -> None:
        start, formulas, end = blocks(step)
        for line in start:
            values.run(line)
        both = re.search(r"`(\w+)_e1 = 0`", step)[1]  # type: ignore[index]
        unknowns = [line.split(" = ")[0] for line in start]
        for _ in range(int(re.search(r"(\d+) of Newton's steps", step)[1])):  # type: ignore[index]
            for line in formulas:
                values.run(line)
            names = [unknown.removesuffix("_slide").removesuffix("_now") for unknown in unknowns]
            slopes = [[values.known[f"{both}_e{k}_by_{name}"] for name in names] for k in (1, 2)]
            move = np.linalg.solve(slopes, [-values.known[f"{both}_e{k}"] for k in (1, 2)])
            for unknown, by in zip(unknowns, move, strict=True):
                self._move(values, unknown, float(by))
        for line in end:
            values.run(line)

    def _move(self, values: Values, unknown: str, by: float) -> None:
        if f"{unknown}.c" not in values.known:
            values.known[unknown] += by
            return
        angle = math.atan2(values.known[f"{unknown}.s"], values.known[f"{unknown}.c"]) + by
        values.known[f"{unknown}.c"], values.known[f"{unknown}.s"] = math.cos(angle), math.sin(angle)


def turn_roots(f: list[float]) -> list[float]:
    """Angles that solve f0 + f1 c + f2 s + f3 c^2 + f4 c s = 0, as roots of a polynomial in e^(i angle)."""
    polynomial = [
        f[3] / 4 - 0.25j * f[4],
        f[1] / 2 - 0.5j * f[2],
        f[0] + f[3] / 2,
        f[1] / 2 + 0.5j * f[2],
        f[3] / 4 + 0.25j * f[4],
    ]
    return sorted(float(np.angle(z)) for z in np.roots(polynomial) if abs(abs(z) - 1) < 1e-7)


def slide_roots(f: list[float]) -> list[float]:
    return sorted(float(z.real) for z in np.roots(f[::-1]) if abs(z.imag) < 1e-9 * (1 + abs(z)))


def structure(name: str, structures: list[Structure]) -> Structure:
    return next(one for one in structures if one.name == name)


DRAWN = [
    (structure("wrist", POSE_ARMS), 0),
    (structure("shoulder", POSE_ARMS), 1),
    (structure("parallel 2-3-4", POSE_ARMS), 0),
    (structure("wrist under RPRRRR", POSE_ARMS), 0),
    (structure("point RRR", POINT_ARMS), 2),
    (structure("point RPR", POINT_ARMS), 1),
    (structure("axis, parallel 2-3-4", AXIS_ARMS), 0),
    (structure("rail, 3 held", HELD_ARMS), 0),
    (structure("pitch RRPR", PITCH_ARMS), 3),
    (structure("plane pose RPR", PLANE_ARMS), 0),
    (structure("scara RRPR", YAW_ARMS), 1),
]
CLOSED = [pytest.param(read_arm(path).arm, id=path.stem) for path in sorted(ARMS.glob("*.toml"))]
CLOSED += [pytest.param(random_arm(kind, number), id=f"{kind.name} {number}") for kind, number in DRAWN]


@pytest.mark.parametrize("arm", CLOSED)
def test_the_printed_steps_reach_the_pose_and_give_the_joints_that_it_came_from(arm: Arm) -> None:
    """Against the link table: every branch with roots reaches the pose, one of them at the joints it was made with."""
    reference = Reference(arm)
    reading = TaskReading(reference)
    inverse = Inverse(arm, text_of(arm))
    for q in reference.random_joints(np.random.default_rng(11), 5):
        pose = reference.forward(q[None])
        found = []
        for choice in itertools.product(*(range(count) for count in inverse.choices)):
            try:
                solved = inverse.solve(pose, q, choice)
            except Search:
                continue
            length, angle = reading.errors(pose, reference.chain(solved[None]))
            assert length[0] <= LENGTH * reference.reach, choice
            assert angle[0] <= ANGLE, choice
            found.append(solved)
        gap = np.array(found) - q
        gap = np.where(reference.revolute, np.abs(np.sin(gap / 2)), np.abs(gap))
        assert gap.max(axis=1).min() < 1e-6


@pytest.mark.parametrize("name", ["vial_picker", "bench_six", "lift_reacher", "tray_scara"])
def test_a_branch_number_means_in_the_c_what_the_text_says(name: str) -> None:
    """The choices taken from the bits of the number give the same joint values as the C on that branch."""
    arm = read_arm(ARMS / f"{name}.toml").arm
    reference, c = Reference(arm), kinematics(arm)
    inverse = Inverse(arm, text_of(arm))
    q = reference.random_joints(np.random.default_rng(3), 6)
    for row in q:
        pose = reference.forward(row[None])
        from_c = c.inverse_all(c.pack(pose), c.rounded(row[None]))
        for branch in range(c.branches):
            bits = tuple(int(bit) for bit in f"{branch:0{len(inverse.choices)}b}") if inverse.choices else ()
            try:
                solved = inverse.solve(pose, row, bits)
            except Search:
                continue
            gap = np.where(reference.revolute, np.sin((solved - from_c.q[0, branch]) / 2), solved - from_c.q[0, branch])
            assert np.abs(gap).max() < 1e-9


@pytest.mark.parametrize("arm", CLOSED)
def test_the_printed_forward_kinematics_are_the_product_of_the_link_transforms(arm: Arm) -> None:
    reference = Reference(arm)
    (lines,) = blocks(section(text_of(arm), "Forward kinematics"))
    for q in reference.random_joints(np.random.default_rng(4), 3):
        values = Values(table_constants(arm) | {f"q[{i}]": float(value) for i, value in enumerate(q)})
        for line in lines:
            values.run(line)
        for name, wanted in pose_values(reference.forward(q[None])).items():
            assert values.known[name] == pytest.approx(wanted, abs=1e-12)


@pytest.mark.parametrize("arm", CLOSED)
def test_each_bit_of_the_branch_number_is_told(arm: Arm) -> None:
    derivation = derive(arm)
    assert derivation is not None
    text = text_of(arm)
    bits = (derivation.plan.branches - 1).bit_length()
    row = re.compile(r"^\| +(\d+) \| [^|]+ \| [^|]+ \| [^|]+ \| [^|]+ \|$", re.MULTILINE)
    told = row.findall(section(text, "Inverse kinematics"))
    numbers = sorted(int(bit) for bit in told[-bits:]) if bits else []
    assert numbers == list(range(bits))


def test_structure_order_singular_places_cost_and_sources_are_told() -> None:
    text = call("explain", PICKER).out
    assert "- shoulder and elbow: axes parallel, 185 mm apart\n" in text
    assert "- waist and shoulder: axes meet at a right angle\n" in text
    assert "- the turning axes among shoulder, elbow and wrist are parallel\n" in text
    assert "- pitch is free where `pitch_x` and `pitch_y` both vanish: the tool's z axis is square to the arm's" in text
    assert "- two branches meet where `elbow_square` is zero: `elbow.s` is zero" in text
    assert re.search(r"^\| `arm_inverse`, one branch +\|( +\d+ \|){6}$", text, re.MULTILINE)
    assert "Paul, Robot Manipulators (1981)" in text
    assert [step.split("\n")[0] for step in step_sections(text)][:5] == [
        f"Step {k}: {name}" for k, name in enumerate(["waist", "pitch", "elbow", "shoulder", "wrist"], start=1)
    ]


@pytest.mark.parametrize("name", ["parallel_six", "seven_held"])
def test_it_is_the_same_every_time(name: str) -> None:
    path = ARMS / f"{name}.toml"
    assert call("explain", path).out == call("explain", path).out


def test_the_file_holds_what_standard_output_would(tmp_path: Path) -> None:
    done = call("explain", PICKER, "--out", tmp_path / "picker.md")
    assert (done.status, done.out) == (0, "")
    assert f"wrote {tmp_path / 'picker.md'}\n" in done.err
    assert (tmp_path / "picker.md").read_text(encoding="utf-8") == call("explain", PICKER).out
    assert names_in(tmp_path) == ["picker.md"]


def test_an_arm_that_cannot_do_its_task_is_refused(tmp_path: Path) -> None:
    (tmp_path / "flat.toml").write_text(CANNOT_REACH, encoding="utf-8")
    done = call("explain", tmp_path / "flat.toml", "--out", tmp_path / "flat.md")
    assert (done.status, done.out) == (1, "")
    assert 'error: flat.toml: task "point" asks for 3 independent motions' in done.err
    assert names_in(tmp_path) == ["flat.toml"]


def test_an_arm_without_a_closed_form_says_so_and_how_many_steps_it_takes(tmp_path: Path) -> None:
    """Manseur and Doty's arm: sixteen solutions, no closed form of low degree (IJRR 8(5), 1989)."""
    path = tmp_path / "sixteen.toml"
    path.write_text(arm_file_text(MANSEUR_DOTY), encoding="utf-8")
    text = call("explain", path).out
    assert "No closed form" in text
    worst = r"^- float: at the very worst \d+ steps when it tracks from the seed, \d+ when it searches"
    assert re.search(worst, text, re.MULTILINE)
    assert "A branch number names a solution only within one call" in text
    assert "`arm_forward`" in text
    assert "Levenberg" in text
