"""The one serial chain that is asked for, read from a robot description in URDF.

Only the joints between root and tip are read in full; of the others, only which links they connect. Numbers are kept as
typed. Every fault found on the chain is reported at once.

URDF: a joint's frame stands at `origin` (xyz in metres, then fixed-axis rpy in radians) in its parent link's frame; the
child link's frame is the joint's, turned about or moved along `axis` by the joint variable.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction

from codegen.adopt.snapping import Typed, read_number
from codegen.adopt.xml_tree import Element, parse_xml
from codegen.errors import CallError, Fault
from codegen.model import JointKind

KINDS = {
    "revolute": JointKind.REVOLUTE,
    "continuous": JointKind.REVOLUTE,
    "prismatic": JointKind.PRISMATIC,
    "fixed": None,
}
MOST_JOINTS = 7
FARTHEST = 1000  # metres or radians: more is a slip, or stands for no limit at all
_XACRO_HINT = "expand it first: xacro FILE.urdf.xacro > FILE.urdf"

Triple = tuple[Typed, Typed, Typed]
ZERO = Typed("0", Fraction(0), 0)
ONE = Typed("1", Fraction(1), 0)


@dataclass(frozen=True, slots=True)
class DescribedJoint:
    """A joint of the chain as the file has it; kind None: fixed. Lengths m, angles rad."""

    name: str
    where: str
    kind: JointKind | None
    xyz: Triple = (ZERO, ZERO, ZERO)
    rpy: Triple = (ZERO, ZERO, ZERO)
    axis: Triple = (ONE, ZERO, ZERO)
    limits: tuple[Typed, Typed] | None = None
    max_speed: Typed | None = None


@dataclass(frozen=True, slots=True)
class Described:
    """The chain from root link to tip link, in order; `notes` tell what in the file was passed over."""

    robot: str
    root: str
    tip: str
    joints: tuple[DescribedJoint, ...]
    notes: tuple[str, ...] = ()

    @property
    def moving(self) -> tuple[DescribedJoint, ...]:
        return tuple(joint for joint in self.joints if joint.kind is not None)


def read_description(content: bytes, source: str, tip: str, root: str | None = None) -> Described:
    """The chain from `root` (default: the link that the tip's branch starts at) to `tip`.

    Raises CallError with every fault found.
    """
    robot = parse_xml(content, source)
    _require_urdf(robot, source)
    links = _unique_names(robot.all("link"), source)
    parents = _parent_joints(robot, links, source)
    path = _path(parents, links, tip, root, source)
    reader = _JointReader(source)
    joints = tuple(reader.read(element) for element in path)
    if reader.faults:
        raise CallError(*reader.faults)
    start = root if root is not None else (_link_of(path[0], "parent") if path else tip)
    described = Described(robot.attributes.get("name", ""), start, tip, joints, tuple(reader.notes))
    _require_joint_count(described, source)
    return described


def _require_urdf(robot: Element, source: str) -> None:
    where = f"{source}: line {robot.line}"
    if robot.tag != "robot":
        hint = "give a robot description in URDF, whose outer element is <robot>"
        raise CallError(Fault(where, f"the outer element is <{robot.tag}>, not <robot>", hint))
    for element in _everything(robot):
        if element.tag.startswith("xacro:"):
            where = f"{source}: line {element.line}"
            raise CallError(Fault(where, f"<{element.tag}> is a macro, not URDF", _XACRO_HINT))
    if not robot.all("link"):
        raise CallError(Fault(where, "there is no <link> in it", "give the robot description itself"))


def _everything(element: Element) -> Iterable[Element]:
    for child in element.children:
        yield child
        yield from _everything(child)


def _unique_names(elements: Sequence[Element], source: str) -> dict[str, Element]:
    """Elements by name; a missing or repeated name is an error."""
    named: dict[str, Element] = {}
    faults = []
    for element in elements:
        where = f"{source}: line {element.line}"
        name = element.attributes.get("name", "")
        if not name:
            faults.append(Fault(where, f"a <{element.tag}> has no name", 'give it one: name="..."'))
        elif name in named:
            what = f'there is another {element.tag} "{name}", at line {named[name].line}'
            faults.append(Fault(where, what, "give each its own name"))
        named[name] = element
    if faults:
        raise CallError(*faults)
    return named


def _link_of(joint: Element, end: str) -> str:
    found = joint.all(end)
    return found[0].attributes.get("link", "") if len(found) == 1 else ""


def _place(joint: Element, source: str) -> str:
    return f'{source}: line {joint.line}: joint "{joint.attributes.get("name", "")}"'


def _parent_joints(robot: Element, links: dict[str, Element], source: str) -> dict[str, Element]:
    """The joint above each link. A link with two is an error: the links would not be a tree."""
    parents: dict[str, Element] = {}
    faults = []
    for joint in _unique_names(robot.all("joint"), source).values():
        for end in ("parent", "child"):
            link = _link_of(joint, end)
            if link not in links:
                faults.append(_no_such_link(joint, end, link, links, source))
        child = _link_of(joint, "child")
        if child in parents:
            what = f'link "{child}" is also the child of joint "{parents[child].attributes["name"]}"'
            faults.append(Fault(_place(joint, source), what, "a link hangs on one joint: closed loops cannot be read"))
        parents[child] = joint
    if faults:
        raise CallError(*faults)
    return parents


def _no_such_link(joint: Element, end: str, link: str, links: Iterable[str], source: str) -> Fault:
    if not link:
        return Fault(_place(joint, source), f"has no one <{end}>", f'add <{end} link="..."/>, once')
    return Fault(_place(joint, source), f'its {end} link "{link}" does not exist', _nearest(link, links))


def _nearest(name: str, names: Iterable[str]) -> str:
    known = sorted(names)
    close = difflib.get_close_matches(name, known, n=1)
    if close:
        return f'did you mean "{close[0]}"?'
    shown = ", ".join(known[:20]) + (", ..." if len(known) > 20 else "")
    return f"links in this file: {shown}"


def _path(
    parents: dict[str, Element], links: dict[str, Element], tip: str, root: str | None, source: str
) -> list[Element]:
    """The joints from the root down to the tip."""
    for option, name in (("--tip", tip), ("--root", root)):
        if name is not None and name not in links:
            raise CallError(Fault(f"{source}: {option}", f'there is no link "{name}"', _nearest(name, links)))
    path: list[Element] = []
    link = tip
    visited = {tip}
    while link != root and link in parents:
        path.insert(0, parents[link])
        link = _link_of(path[0], "parent")
        if link in visited:
            raise CallError(Fault(_place(path[0], source), f'link "{link}" hangs on itself in a loop', "cut the loop"))
        visited.add(link)
    if root is not None and link != root:
        raise CallError(_not_below(root, tip, link, visited, parents, source))
    return path


def _not_below(root: str, tip: str, top: str, above_tip: set[str], parents: dict[str, Element], source: str) -> Fault:
    """Tells where the branch of the tip and that of the root part."""
    what = f'link "{tip}" is not below link "{root}": its branch starts at "{top}"'
    link, above_root = root, {root}
    while link not in above_tip and link in parents:
        link = _link_of(parents[link], "parent")
        if link in above_root:
            break
        above_root.add(link)
    if tip in above_root:
        return Fault(f"{source}: --root", what, f"exchange them: --root {tip} --tip {root}")
    parted = f"use --root {link}, where the two branches part, or one above it"
    return Fault(f"{source}: --root", what, parted if link in above_tip else "give another --root")


def _require_joint_count(described: Described, source: str) -> None:
    count = len(described.moving)
    where = f"{source}: {described.root} to {described.tip}"
    if count == 0:
        raise CallError(Fault(where, "no joint between them moves", "choose a --tip beyond the moving joints"))
    if count > MOST_JOINTS:
        names = ", ".join(joint.name for joint in described.moving)
        what = f"{count} joints move between them ({names}); at most {MOST_JOINTS} can be"
        raise CallError(Fault(where, what, 'choose --root and --tip nearer to each other, or make joints type="fixed"'))


class _JointReader:
    """Reads joints one by one, keeping the faults and notes."""

    def __init__(self, source: str) -> None:
        self.source = source
        self.faults: list[Fault] = []
        self.notes: list[str] = []

    def read(self, joint: Element) -> DescribedJoint:
        where = _place(joint, self.source)
        kind = self._kind(joint, where)
        origin = self._only(joint, "origin", where)
        described = DescribedJoint(
            name=joint.attributes["name"],
            where=where,
            kind=kind,
            xyz=self._triple(origin, "xyz", where, (ZERO, ZERO, ZERO)),
            rpy=self._triple(origin, "rpy", where, (ZERO, ZERO, ZERO)),
        )
        if kind is None:
            return described
        return self._moving(joint, described)

    def _kind(self, joint: Element, where: str) -> JointKind | None:
        found = joint.attributes.get("type", "")
        if found not in KINDS:
            what = f'its type is "{found}"' if found else "has no type"
            hint = f"a serial chain has joints of type {', '.join(sorted(KINDS))}"
            if found in ("floating", "planar"):
                hint += "; choose a --root below this joint"
            self.faults.append(Fault(where, what, hint))
        return KINDS.get(found)

    def _moving(self, joint: Element, described: DescribedJoint) -> DescribedJoint:
        where = described.where
        for mimic in joint.all("mimic"):
            what = f'mimics joint "{mimic.attributes.get("joint", "")}": it does not move by itself'
            self.faults.append(Fault(where, what, 'choose a --tip above it, or make it type="fixed"'))
        for _ in joint.all("safety_controller"):
            self.notes.append(f'joint "{described.name}": the soft limits of its safety_controller were not read')
        axis = self._triple(self._only(joint, "axis", where), "xyz", where, (ONE, ZERO, ZERO))
        if not any(number.value for number in axis):
            self.faults.append(Fault(where, "its axis is 0 0 0", 'give its direction: <axis xyz="0 0 1"/>'))
            axis = (ONE, ZERO, ZERO)
        limit = self._only(joint, "limit", where)
        return DescribedJoint(
            described.name,
            where,
            described.kind,
            described.xyz,
            described.rpy,
            axis,
            limits=self._limits(joint, limit, where),
            max_speed=self._max_speed(limit, where),
        )

    def _limits(self, joint: Element, limit: Element | None, where: str) -> tuple[Typed, Typed] | None:
        if joint.attributes.get("type") == "continuous":
            if limit is not None and {"lower", "upper"} & set(limit.attributes):
                name = joint.attributes["name"]
                self.notes.append(f'joint "{name}" is continuous: its limits in the file do not count')
            return None
        if limit is None:
            self.notes.append(f'joint "{joint.attributes["name"]}" has no <limit>: taken as unlimited')
            return None
        lower = self._number(limit, "lower", where) or ZERO
        upper = self._number(limit, "upper", where) or ZERO
        if lower.value < -FARTHEST and upper.value > FARTHEST:
            self.notes.append(f'joint "{joint.attributes["name"]}" has limits that mean none: taken as unlimited')
            return None
        for end in (lower, upper):
            self._require_sane(end, f'limit "{end.text}"', where)
        if lower.value >= upper.value:
            what = f'lower="{lower.text}" is not below upper="{upper.text}"'
            self.faults.append(Fault(where, what, 'mend the limits, or make the joint type="fixed" or "continuous"'))
        return lower, upper

    def _max_speed(self, limit: Element | None, where: str) -> Typed | None:
        speed = self._number(limit, "velocity", where) if limit is not None else None
        if speed is not None and speed.value < 0:
            self.faults.append(Fault(where, f'velocity="{speed.text}" is negative', "give the largest speed, above 0"))
        return speed if speed is not None and 0 < speed.value < FARTHEST else None

    def _only(self, joint: Element, tag: str, where: str) -> Element | None:
        found = joint.all(tag)
        if len(found) > 1:
            self.faults.append(Fault(where, f"has {len(found)} elements <{tag}>", "keep the one that is meant"))
        return found[0] if found else None

    def _number(self, element: Element, key: str, where: str) -> Typed | None:
        text = element.attributes.get(key)
        if text is None:
            return None
        return self._checked(text.strip(), f'{key}="{text}"', where)

    def _triple(self, element: Element | None, key: str, where: str, default: Triple) -> Triple:
        text = element.attributes.get(key) if element is not None else None
        if element is None or text is None:
            return default
        found = f'<{element.tag} {key}="{text}">'
        words = text.split()
        if len(words) != 3 and "${" not in text:
            self.faults.append(Fault(where, f"{found} has {len(words)} numbers", "give three, with spaces between"))
            return default
        numbers = [self._checked(word, found, where) for word in words[:3]]
        for number in numbers:
            self._require_sane(number or ZERO, found, where)
        return (numbers[0] or ZERO, numbers[1] or ZERO, numbers[2] or ZERO) if len(numbers) == 3 else default

    def _checked(self, word: str, found: str, where: str) -> Typed | None:
        number = read_number(word)
        if number is None and ("${" in found or "$(" in found):
            self._fault_once(Fault(where, f"{found} holds a macro, not a number", _XACRO_HINT))
        elif number is None:
            self._fault_once(Fault(where, f'{found}: "{word}" is no finite number', "write decimal numbers"))
        return number

    def _require_sane(self, number: Typed, found: str, where: str) -> None:
        if abs(number.value) > FARTHEST:
            self._fault_once(Fault(where, f"{found} is absurdly large", "URDF is in metres and radians"))

    def _fault_once(self, fault: Fault) -> None:
        if fault not in self.faults:
            self.faults.append(fault)
