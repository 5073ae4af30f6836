"""Kept values: the integers of every trajectory of a batch, compact.

One chunk is a head and, compressed, the differences from the smallest integer in as few bytes as they need: first all
lowest bytes, coordinate by coordinate, then the next ones. Neighbors in this order are alike, and one code serves all.
"""

import hashlib
import struct
import zlib
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

BATCH_BYTES: Final = 4_000_000
"""Most that the values of one batch take before they are compressed; a single trajectory may take more."""
_MAGIC: Final = b"SMV1"
_HEAD = struct.Struct("<4sqiiiq")  # magic, trajectories, coordinates, components, width, smallest integer
_SIGNED = (np.int8, np.int16, np.int32, np.int64)


class Chunk(NamedTuple):
    """Values of one batch; ``digest`` is that of the integers, whichever library compressed them."""

    data: bytes
    digest: str


def narrowed(values: NDArray[np.signedinteger]) -> NDArray[np.signedinteger]:
    """The same integers in the smallest signed type that holds them."""
    least, most = int(values.min()), int(values.max())
    kind = next(kind for kind in _SIGNED if np.iinfo(kind).min <= least and most <= np.iinfo(kind).max)
    return values.astype(kind, copy=False)


def pack(values: NDArray[np.signedinteger]) -> Chunk:
    """Pack values [n, C] or [n, C, K]."""
    values = narrowed(values[:, :, None] if values.ndim == 2 else values)
    count, coordinates, components = values.shape
    least = values.min()
    # the difference may leave the signed type but never the unsigned one of that size
    columns = (np.moveaxis(values, 0, -1) - least).astype(values.dtype.newbyteorder("<"), order="C")
    width = max(1, ((int(values.max()) - int(least)).bit_length() + 7) // 8)
    head = _HEAD.pack(_MAGIC, count, coordinates, components, width, int(least))
    octets = columns.reshape(-1, 1).view(np.uint8)
    planes = b"".join(octets[:, place].tobytes() for place in range(width))
    squeeze = zlib.compressobj(6, zlib.DEFLATED, zlib.MAX_WBITS, zlib.DEF_MEM_LEVEL, zlib.Z_FILTERED)
    return Chunk(head + squeeze.compress(planes) + squeeze.flush(), hashlib.sha256(head + planes).hexdigest())


def unpack(data: bytes) -> NDArray[np.int64]:
    """Values [n, C, K] of a chunk. Raises ValueError for anything else."""
    if len(data) < _HEAD.size or data[:4] != _MAGIC:
        raise ValueError("these bytes are not kept values of this format")
    _, count, coordinates, components, width, least = _HEAD.unpack_from(data)
    size = count * coordinates * components
    try:
        planes = np.frombuffer(zlib.decompress(data[_HEAD.size :]), np.uint8)
    except zlib.error as error:
        raise ValueError(f"kept values cannot be read: {error}") from error
    if len(planes) != width * size:
        raise ValueError(f"kept values of {size} integers should have {width * size} bytes, not {len(planes)}")
    columns = np.zeros(size, dtype=np.uint64)
    for place, plane in enumerate(planes.reshape(width, size)):
        columns |= plane.astype(np.uint64) << np.uint64(8 * place)
    found = columns.view(np.int64) + least
    return np.ascontiguousarray(np.moveaxis(found.reshape(coordinates, components, count), -1, 0))
