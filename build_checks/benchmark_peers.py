"""The hand-written C that generated code is measured against: which there is, and its files."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

_FOLDER = Path(__file__).with_name("peers")
PEER_PREFIX = "peer"


@dataclass(frozen=True, slots=True)
class Peer:
    """Careful C with the toolchain's mathematics for one arm of arms/, in float, same interface and prefix "peer"."""

    arm: str
    what: str


PEERS = (
    Peer("bench_six", "six joints: elbow arm, shoulder and elbow offset, spherical wrist"),
    Peer("vial_picker", "four joints: yaw and three pitch joints"),
    Peer("tray_scara", "four joints: two parallel turns, slide, turn"),
)


def peer_files(peer: Peer) -> dict[str, str]:
    """Its C files by name, ready to compile in one folder."""
    paths = [*_FOLDER.glob("*.h"), *(_FOLDER / peer.arm).glob("peer_kin.[ch]")]
    return {path.name: path.read_text() for path in sorted(paths)}
