"""Everything that talks to PySCF; nothing outside this package imports it.

What comes in are plain numbers and checked names (geometries in bohr, never strings to evaluate); what goes
out are records and :class:`scission.solution.Solution` objects made of plain arrays.  This module imports
nothing, so that planning and supervising stay free of chemistry.
"""
