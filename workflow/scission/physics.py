"""The version of the physics: what makes old numbers comparable with new ones."""

PHYSICS_VERSION = 1
"""Raised by hand whenever the chemistry's numbers change; it is part of every key, so records of another
version are never used."""
