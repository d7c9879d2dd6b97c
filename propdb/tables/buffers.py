"""Arrow arrays and numpy arrays over the same memory.

Only buffers are exchanged: ``pyarrow.array``, ``Array.to_numpy`` and compute calls with Python values import pandas
where it is installed, which costs more time and memory than a table of ten thousand rows.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from propdb.tables.extras import need

__all__ = ["arrow", "codes_of", "dictionary_of", "floats", "number_array", "text_array", "valid"]


def arrow() -> Any:
    """The module pyarrow. Raises PropdbError where it is not installed."""
    return need("pyarrow", extra="tables", what="a table")


def text_array(texts: Sequence[str | None]) -> Any:
    """Texts as an Arrow string array."""
    pa = arrow()
    encoded = [b"" if text is None else text.encode("utf-8", "surrogateescape") for text in texts]
    offsets = np.zeros(len(texts) + 1, np.int32)
    np.cumsum([len(text) for text in encoded], out=offsets[1:])
    bits = None
    nulls = sum(text is None for text in texts)
    if nulls:
        bits = pa.py_buffer(np.packbits([text is not None for text in texts], bitorder="little"))
    return pa.Array.from_buffers(
        pa.string(), len(texts), [bits, pa.py_buffer(offsets), pa.py_buffer(b"".join(encoded))], nulls
    )


def number_array(values: NDArray[Any], type_: Any, mask: NDArray[np.bool_] | None = None) -> Any:
    """A numpy array as an Arrow array of a type of the same width; rows where ``mask`` is true are null."""
    pa = arrow()
    bits, nulls = None, 0
    if mask is not None:
        nulls = int(np.count_nonzero(mask))
        if nulls:
            bits = pa.py_buffer(np.packbits(~mask, bitorder="little"))
    return pa.Array.from_buffers(type_, len(values), [bits, pa.py_buffer(np.ascontiguousarray(values))], nulls)


def dictionary_of(indices: NDArray[np.int32], texts: Sequence[str | None]) -> Any:
    """A dictionary array: ``texts[i]`` for each index."""
    pa = arrow()
    return pa.DictionaryArray.from_arrays(number_array(indices, pa.int32()), text_array(texts), safe=False)


def valid(array: Any) -> NDArray[np.bool_] | None:
    """Which values are there; None where all are."""
    if not array.null_count:
        return None
    buffer = array.buffers()[0]
    if buffer is None:
        return np.zeros(len(array), np.bool_)  # the null type
    bits = np.unpackbits(np.frombuffer(buffer, np.uint8), bitorder="little")
    return bits[array.offset : array.offset + len(array)].astype(np.bool_)


def view(array: Any, dtype: Any) -> NDArray[Any]:
    """The values of a fixed-width Arrow array, without a copy; what stands under a null is undefined."""
    if not len(array):
        return np.empty(0, dtype)
    width = np.dtype(dtype).itemsize
    return np.frombuffer(array.buffers()[1], dtype, count=len(array), offset=array.offset * width)


def floats(array: Any) -> NDArray[np.float64]:
    """Numbers of any Arrow type as float64, NaN where there is none. Raises pyarrow's errors for other types."""
    pa = arrow()
    if pa.types.is_null(array.type):
        return np.full(len(array), np.nan)
    if array.type != pa.float64():
        array = array.cast(pa.float64(), safe=False)  # an integer beyond 2**53 loses its last digits
    values: NDArray[np.float64] = view(array, np.float64)
    there = valid(array)
    return values if there is None else np.where(there, values, np.nan)


def codes_of(array: Any) -> tuple[NDArray[np.int32], list[str | None]]:
    """A column of texts as places in the list of its distinct texts; the last of the list is None, for nulls."""
    pa = arrow()
    if not pa.types.is_dictionary(array.type):
        array = array.cast(pa.string()) if not pa.types.is_string(array.type) else array
        array = array.dictionary_encode()
    indices = array.indices if array.indices.type == pa.int32() else array.indices.cast(pa.int32())
    texts: list[str | None] = array.dictionary.to_pylist()
    values: NDArray[np.int32] = view(indices, np.int32)
    there = valid(indices)
    texts.append(None)
    return (values if there is None else np.where(there, values, np.int32(len(texts) - 1))), texts
