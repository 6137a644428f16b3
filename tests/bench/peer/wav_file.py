"""The 16-bit WAV file of sound_bench.lua, open and already without a name."""
import os
import struct
import tempfile

import numpy as np

FRAMES = 1 << 27
BLOCK = 65536


def opened():
    number, path = tempfile.mkstemp()
    file = os.fdopen(number, "w+b", buffering=0)
    file.write(b"RIFF" + struct.pack("<I", 36 + 2 * FRAMES) + b"WAVEfmt "
               + struct.pack("<IHHIIHH", 16, 1, 1, 48000, 96000, 2, 16)
               + b"data" + struct.pack("<I", 2 * FRAMES))
    i = np.arange(1, BLOCK + 1)
    block = (i * 7919 % 60000 - 30000).astype("<i2").tobytes()
    for _ in range(FRAMES // BLOCK):
        file.write(block)
    os.remove(path)
    return file
