"""PNG pictures, read back by an independent decoder."""

from __future__ import annotations

import struct
import zlib

import numpy as np

from haarloom.widgets.raster import png, tinted


def decode(data: bytes) -> np.ndarray:
    """A decoder for unfiltered RGB files, straight from the chunk layout of the PNG standard."""
    assert data[:8] == b"\x89PNG\r\n\x1a\n"
    at, chunks = 8, {}
    while at < len(data):
        (length,) = struct.unpack(">I", data[at : at + 4])
        name, body = data[at + 4 : at + 8], data[at + 8 : at + 8 + length]
        assert struct.unpack(">I", data[at + 8 + length : at + 12 + length]) == (zlib.crc32(name + body),)
        chunks[name] = body
        at += 12 + length
    width, height = struct.unpack(">II", chunks[b"IHDR"][:8])
    rows = np.frombuffer(zlib.decompress(chunks[b"IDAT"]), np.uint8).reshape(height, 1 + 3 * width)
    return rows[:, 1:].reshape(height, width, 3)


def test_png_round_trip(rng: np.random.Generator) -> None:
    pixels = rng.integers(0, 256, size=(7, 5, 3), dtype=np.uint8)
    np.testing.assert_array_equal(decode(png(pixels)), pixels)


def test_tint_hits_the_stops_and_the_middle_and_clips() -> None:
    colours = tinted(np.array([[-5.0, 0.0, 0.5, 1.0, 9.0]]), ("#000000", "#804020", "#ffffff"), 0.0, 1.0)
    assert colours[0].tolist() == [[0, 0, 0], [0, 0, 0], [128, 64, 32], [255, 255, 255], [255, 255, 255]]
