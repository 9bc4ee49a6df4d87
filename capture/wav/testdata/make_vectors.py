#!/usr/bin/python3
"""Writes the recordings in vectors/ and what independent readers see in them.

    cd capture/wav/testdata && /usr/bin/python3 make_vectors.py

Made with: Python 3.11.2, numpy 1.24.2, scipy 1.10.1 (scipy.io.wavfile),
soundfile 0.12.1 over libsndfile 1.2.0, and wave of Python's own library
(Debian 12: python3-numpy python3-scipy python3-soundfile).

Each file is written by one of these libraries and read back by another where
two of them know its kind. vectors.json holds the values as fractions of full
scale: an integer code over 2^(bits - 1), floats as they are.
"""
import json
import os
import wave

import numpy as np
import scipy.io.wavfile
import soundfile

OUT = "vectors"
FRAMES = 37  # odd, so that odd frame sizes need a pad byte


def codes(channels, bits, seed):
    """Integers over the whole range of bits, the extremes among them."""
    x = seed
    out = np.empty((FRAMES, channels), dtype=np.int64)
    for i in range(FRAMES):
        for c in range(channels):
            x = (1664525 * x + 1013904223) % 2**32
            out[i, c] = (x >> (32 - bits)) - 2 ** (bits - 1)
    out[0, 0], out[1, 0] = -(2 ** (bits - 1)), 2 ** (bits - 1) - 1
    return out


def fractions(raw, dtype):
    """What a reader's integers mean."""
    if dtype == np.uint8:
        return (raw.astype(float) - 128) / 128
    if dtype == np.int16:
        return raw.astype(float) / 2**15
    if dtype == np.int32:
        return raw.astype(float) / 2**31
    return raw.astype(float)


def by_scipy(path):
    rate, raw = scipy.io.wavfile.read(path)
    return rate, fractions(np.atleast_2d(raw.T).T, raw.dtype)


def by_soundfile(path):
    x, rate = soundfile.read(path, dtype="float64", always_2d=True)
    return rate, x


vectors, refused = [], []


def note(name, writer, reader, words):
    rate, x = reader(f"{OUT}/{name}.wav")
    vectors.append({
        "file": name + ".wav", "writer": writer, "reader": reader.__name__[3:],
        "format": words, "rate_hz": rate, "channels": [[float(v) for v in c] for c in x.T],
    })


def main():
    os.makedirs(OUT, exist_ok=True)
    for f in os.listdir(OUT):
        os.remove(f"{OUT}/{f}")

    # scipy.io.wavfile as the writer
    w = scipy.io.wavfile.write
    w(f"{OUT}/int8-mono.wav", 11025, (codes(1, 8, 1) + 128).astype(np.uint8))
    note("int8-mono", "scipy", by_soundfile, "WAV 8-bit PCM")
    w(f"{OUT}/int16-stereo.wav", 44100, codes(2, 16, 2).astype(np.int16))
    note("int16-stereo", "scipy", by_soundfile, "WAV 16-bit PCM")
    w(f"{OUT}/int32-stereo.wav", 192000, codes(2, 32, 3).astype(np.int32))
    note("int32-stereo", "scipy", by_soundfile, "WAV 32-bit PCM")
    w(f"{OUT}/float32-stereo.wav", 96000, (codes(2, 24, 4) / 2**22).astype(np.float32))
    note("float32-stereo", "scipy", by_soundfile, "WAV 32-bit float")
    w(f"{OUT}/float64-mono.wav", 48000, codes(1, 32, 5) / 3e9)
    note("float64-mono", "scipy", by_soundfile, "WAV 64-bit float")
    w(f"{OUT}/int16-high-rate.wav", 3072000, codes(1, 16, 6).astype(np.int16))
    note("int16-high-rate", "scipy", by_soundfile, "WAV 16-bit PCM")

    # Python's wave as the writer, scipy and soundfile as readers
    for name, channels in (("int24-mono-odd", 1), ("int24-stereo", 2)):
        with wave.open(f"{OUT}/{name}.wav", "wb") as f:
            f.setnchannels(channels)
            f.setsampwidth(3)
            f.setframerate(96000)
            f.writeframes(b"".join(int(v).to_bytes(3, "little", signed=True) for v in codes(channels, 24, 7).ravel()))
        note(name, "wave", by_scipy if channels == 2 else by_soundfile, "WAV 24-bit PCM")

    # soundfile as the writer: extensible (WAVEX), RF64, many channels
    for name, channels, rate, fmt, sub, words in (
        ("extensible-int24-6ch", 6, 48000, "WAVEX", "PCM_24", "WAV 24-bit PCM"),
        ("extensible-int8-stereo", 2, 8000, "WAVEX", "PCM_U8", "WAV 8-bit PCM"),
        ("extensible-float32-3ch", 3, 48000, "WAVEX", "FLOAT", "WAV 32-bit float"),
        ("extensible-float64-stereo", 2, 48000, "WAVEX", "DOUBLE", "WAV 64-bit float"),
        ("int16-64ch", 64, 48000, "WAV", "PCM_16", "WAV 16-bit PCM"),
        ("rf64-int24-stereo", 2, 96000, "RF64", "PCM_24", "RF64 24-bit PCM"),
        ("rf64-float32-mono", 1, 96000, "RF64", "FLOAT", "RF64 32-bit float"),
    ):
        x = codes(channels, 24, 8) / 2**23
        soundfile.write(f"{OUT}/{name}.wav", x, rate, format=fmt, subtype=sub)
        note(name, "soundfile", by_soundfile, words)

    # what is refused, with the name it must be refused by
    x = codes(1, 16, 9) / 2**15
    for name, sub, word in (
        ("a-law", "ALAW", "A-law"), ("mu-law", "ULAW", "mu-law"), ("adpcm-2", "MS_ADPCM", "ADPCM"),
        ("adpcm-17", "IMA_ADPCM", "ADPCM"), ("gsm", "GSM610", "GSM"), ("g721", "G721_32", "ADPCM"),
    ):
        soundfile.write(f"{OUT}/refused-{name}.wav", x, 8000, format="WAV", subtype=sub)
        refused.append({"file": f"refused-{name}.wav", "names": word})
    soundfile.write(f"{OUT}/refused-big-endian.wav", x, 8000, format="WAV", subtype="PCM_16", endian="BIG")
    refused.append({"file": "refused-big-endian.wav", "names": "big-endian"})
    soundfile.write(f"{OUT}/refused-extensible-a-law.wav", x, 8000, format="WAVEX", subtype="ALAW")
    refused.append({"file": "refused-extensible-a-law.wav", "names": "A-law"})

    with open("vectors.json", "w") as f:
        f.write('{"made_with": "scipy 1.10.1, soundfile 0.12.1 (libsndfile 1.2.0), Python 3.11.2",\n "vectors": [\n')
        f.write(",\n".join("  " + json.dumps(v) for v in vectors))
        f.write('\n ],\n "refused": [\n')
        f.write(",\n".join("  " + json.dumps(r) for r in refused))
        f.write("\n ]}\n")


main()
