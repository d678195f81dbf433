"""Inverse kinematics: from a chain to a plan of stages, each with the choices it leaves open."""
