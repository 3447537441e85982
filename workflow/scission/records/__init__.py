"""Records: what is kept of each calculation, and how the numbers of a campaign come together.

``schema`` is the one list of names, units and meanings; ``store`` keeps one file per calculation;
``gather`` streams them into one HDF5 file.
"""
