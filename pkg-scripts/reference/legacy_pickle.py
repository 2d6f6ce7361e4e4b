"""Reads the legacy PyTorch file format (before the ZIP format of 2020) without PyTorch.

The file is five pickles (magic number, protocol version, system information, the object, the list of storage keys)
followed by each storage: a little-endian 64-bit count of elements, then the raw values.
"""

import pickle
from collections import OrderedDict

import numpy as np

MAGIC = 0x1950A86A20F9469CFC6C
DTYPES = {"FloatStorage": "<f4", "DoubleStorage": "<f8", "HalfStorage": "<f2", "LongStorage": "<i8", "IntStorage": "<i4"}


class _Storage:
    def __init__(self, dtype):
        self.dtype = np.dtype(dtype)
        self.values = None


class _View:
    """A tensor as the file describes it: a strided view of a storage."""

    def __init__(self, storage, offset, shape, strides, *_):
        self.storage, self.offset, self.shape, self.strides = storage, offset, shape, strides

    def array(self):
        size = self.storage.dtype.itemsize
        # The 4-D tensors of some files are transposed views: without the strides every weight is in the wrong place.
        view = np.lib.stride_tricks.as_strided(
            self.storage.values[self.offset :], self.shape, [stride * size for stride in self.strides]
        )
        return np.ascontiguousarray(view)


class _Unpickler(pickle.Unpickler):
    """Knows the few names a file of tensors needs and refuses every other one, since a pickle can name any function."""

    def __init__(self, file, storages):
        super().__init__(file)
        self.storages = storages

    def find_class(self, module, name):
        if (module, name) == ("collections", "OrderedDict"):
            return OrderedDict
        if (module, name) == ("torch._utils", "_rebuild_tensor_v2"):
            return _View
        if module == "torch" and name in DTYPES:
            return name
        raise pickle.UnpicklingError(f"unexpected name in the file: {module}.{name}")

    def persistent_load(self, reference):
        kind, storage_type, key = reference[:3]
        if kind != "storage":
            raise pickle.UnpicklingError(f"unexpected reference in the file: {kind}")
        return self.storages.setdefault(key, _Storage(DTYPES[storage_type]))


def read(file):
    """The tensors of an open legacy file, as a dict from name to NumPy array."""
    storages = {}
    magic, _protocol, _system, tensors, keys = (_Unpickler(file, storages).load() for _ in range(5))
    if magic != MAGIC:
        raise ValueError("not a legacy PyTorch file")
    for key in keys:
        count = int.from_bytes(file.read(8), "little")
        storage = storages[key]
        storage.values = np.frombuffer(file.read(count * storage.dtype.itemsize), storage.dtype)
        if len(storage.values) != count:
            raise ValueError(f"the file ends inside storage {key}")
    return {name: view.array() for name, view in tensors.items()}
