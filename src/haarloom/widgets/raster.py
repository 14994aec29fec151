"""A real function on a grid as a small PNG picture, coloured by a ramp."""

from __future__ import annotations

import struct
import zlib
from collections.abc import Sequence

import numpy as np

__all__ = ["png", "tinted"]


def tinted(values: np.ndarray, ramp: Sequence[str], low: float, high: float) -> np.ndarray:
    """Colours between the stops of a ramp, which divide low … high evenly.

    Parameters
    ----------
    values
        Shape (rows, columns).
    ramp
        Colours as ``#rrggbb``.

    Returns
    -------
    uint8 array, shape (rows, columns, 3).
    """
    stops = np.array([[int(colour[k : k + 2], 16) for k in (1, 3, 5)] for colour in ramp], dtype=float)
    place = np.clip((values - low) / (high - low), 0.0, 1.0) * (len(stops) - 1)
    channels = [np.interp(place, np.arange(len(stops)), stops[:, channel]) for channel in range(3)]
    return np.rint(np.stack(channels, axis=-1)).astype(np.uint8)


def png(pixels: np.ndarray) -> bytes:
    """A PNG file of an RGB image (W3C, *Portable Network Graphics*, 3rd ed.: no filter, deflate).

    Parameters
    ----------
    pixels
        uint8, shape (rows, columns, 3), the top row first.
    """
    rows, columns, _ = pixels.shape
    header = struct.pack(">IIBBBBB", columns, rows, 8, 2, 0, 0, 0)
    unfiltered = np.zeros((rows, 1 + 3 * columns), dtype=np.uint8)
    unfiltered[:, 1:] = pixels.reshape(rows, -1)
    data = zlib.compress(unfiltered.tobytes(), 1)
    chunks = ((b"IHDR", header), (b"IDAT", data), (b"IEND", b""))
    return b"\x89PNG\r\n\x1a\n" + b"".join(_chunk(name, body) for name, body in chunks)


def _chunk(name: bytes, body: bytes) -> bytes:
    return struct.pack(">I", len(body)) + name + body + struct.pack(">I", zlib.crc32(name + body))
