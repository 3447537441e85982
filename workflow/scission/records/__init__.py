"""Records: what is kept of each calculation, and how the numbers of a campaign come together.

``schema`` is the one list of names, units and meanings; ``store`` keeps one file per calculation;
``gather`` streams them into one HDF5 file (imported from there, since it loads h5py).
"""

from scission.records.recall import Planned, recall, recall_point, settled_scalars
from scission.records.store import Record, Store
from scission.records.validate import settled

__all__ = ["Planned", "Record", "Store", "recall", "recall_point", "settled", "settled_scalars"]
