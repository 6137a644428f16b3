"""Writes HDF5 files with h5py, an independent writer, for the tests.

hdf5_files.py FOLDER makes: old.h5 (old-style groups), new.h5 (superblock 3,
object headers 2, compact links), several.h5 (a dataset per channel), chunks.h5
(compressed), big.h5 (big-endian floats).
"""
import sys

import h5py
import numpy as np

folder = sys.argv[1]
codes = np.array([[1, -2], [3, 4], [-32768, 32767]], dtype="<i2")

with h5py.File(folder + "/old.h5", "w") as f:
    f["x"] = codes
with h5py.File(folder + "/new.h5", "w", libver="latest") as f:
    d = f.create_dataset("samples", data=codes)
    d.attrs["rate"] = np.bytes_(b"51200/7")
    d.attrs["units"] = np.array([b"V", b"Pa"])
    d.attrs["factors"] = np.array([0.5, 2.0])
with h5py.File(folder + "/several.h5", "w") as f:
    for i in range(20):
        f["channel%02d" % i] = np.arange(5, dtype="<f8") * i
with h5py.File(folder + "/chunks.h5", "w") as f:
    f.create_dataset("x", data=codes, compression="gzip")
with h5py.File(folder + "/big.h5", "w") as f:
    f["x"] = np.array([0.5, -1.25, 3e38], dtype=">f4")
