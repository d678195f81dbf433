"""The commands, one small module each. A module imports what it needs only when its command runs."""
