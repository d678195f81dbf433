"""linkwright: C kinematics of a serial arm from its link table."""

VERSION = "0.1.0"
