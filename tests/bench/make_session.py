#!/usr/bin/python3
"""Makes the frames that scripts/bench measures, quickly and the same every time.

    make_session.py FOLDER --size WIDTHxHEIGHT --levels N --frames N [--even] [--parts N] CONTAINER...

CONTAINER: tiff, fits, deflate (TIFF), rice (FITS). Each gets a folder FOLDER/CONTAINER with one file a series and its
session.toml. --parts N: N files a series instead of one, each of --frames frames; session_1.toml then names the first
part of each series and session_N.toml all of them, so that the same pixels serve for short and long series.

The camera is simple on purpose, since only speed is judged by it: 16 bits, 2 DN a photoelectron, offset 100 DN, read noise
3 DN, 0.5 % pixel response non-uniformity; the light drifts by 1 % from frame to frame, falls to a half from the centre
to the corners, and a dozen pixels of each frame are hit. --even: even light, no hits. The brightest level saturates in
the centre. Noise is drawn once and moved by another distance for each frame: independent pixel by pixel."""
import argparse
import multiprocessing
import os
import pathlib

import numpy as np
import tifffile
from astropy.io import fits

GAIN_DN_PER_E, OFFSET_DN, READ_NOISE_DN, BRIGHTEST_DN = 2.0, 100.0, 3.0, 67000.0
DRIFT, VIGNETTING, PRNU, HITS, HIT_DN = 0.01, 0.5, 0.005, 12, 3000


class Camera:
    def __init__(self, width, height, even):
        random = np.random.default_rng(20261124)
        self.width, self.height, self.even = width, height, even
        x, y = np.linspace(-1, 1, width, dtype=np.float32), np.linspace(-1, 1, height, dtype=np.float32)
        light = np.ones((height, width), np.float32) if even else 1 - VIGNETTING / 2 * (x[None, :] ** 2 + y[:, None] ** 2)
        self.light = light * (1 + PRNU * random.standard_normal((height, width), np.float32))
        self.noise = random.standard_normal(2 * width * height, np.float32)

    def frames(self, series, level, count):
        """16-bit frames of one level (0 to 1 of the brightest; 0: a dark), one at a time in one reused buffer."""
        random = np.random.default_rng([20261124, series])
        mean = BRIGHTEST_DN * level * self.light
        spread = np.sqrt(GAIN_DN_PER_E * mean + READ_NOISE_DN**2)
        pixels, light = np.empty_like(mean), np.empty_like(mean)
        for _ in range(count):
            start = random.integers(mean.size)
            np.multiply(self.noise[start:start + mean.size].reshape(mean.shape), spread, out=pixels)
            np.multiply(mean, np.float32(1 + DRIFT * random.standard_normal()), out=light)
            pixels += light
            pixels += np.float32(OFFSET_DN)
            if not self.even:
                pixels[random.integers(0, self.height, HITS), random.integers(0, self.width, HITS)] += HIT_DN
            np.rint(pixels, out=pixels)
            np.clip(pixels, 0, 65535, out=pixels)
            yield pixels.astype(np.uint16)


class TiffFile:
    def __init__(self, path, frames, shape, **compression):
        self.out, self.compression = tifffile.TiffWriter(path), compression

    def add(self, frame):
        self.out.write(frame, photometric="minisblack", metadata=None, contiguous=False, **self.compression)

    def close(self):
        self.out.close()


class FitsCube:
    """Unsigned 16-bit numbers as FITS has them: big-endian and less 32768 (FITS standard 4.0, 4.4.2.5)."""
    def __init__(self, path, frames, shape):
        cards = ["SIMPLE  =                    T", "BITPIX  =                   16", "NAXIS   =                    3",
                 f"NAXIS1  = {shape[1]:20d}", f"NAXIS2  = {shape[0]:20d}", f"NAXIS3  = {frames:20d}",
                 "BSCALE  =                  1.0", "BZERO   =              32768.0", "END"]
        header = "".join(card.ljust(80) for card in cards).encode("ascii")
        self.out = open(path, "wb")
        self.out.write(header.ljust(2880))

    def add(self, frame):
        (frame ^ np.uint16(0x8000)).byteswap().tofile(self.out)

    def close(self):
        self.out.write(b"\0" * (-self.out.tell() % 2880))
        self.out.close()


class RiceFits:
    """A Rice-compressed image extension for each frame, in tiles of one row as CFITSIO has them by default."""
    def __init__(self, path, frames, shape):
        self.path, self.hdus = path, [fits.PrimaryHDU()]

    def add(self, frame):
        self.hdus.append(fits.CompImageHDU(frame, compression_type="RICE_1", uint=True))

    def close(self):
        fits.HDUList(self.hdus).writeto(self.path)


WRITERS = {
    "tiff": (".tif", TiffFile),
    "fits": (".fits", FitsCube),
    # Level 1 makes noise as small as the default level 6 does and as quick to decode, in half the time.
    "deflate": (".tif", lambda *place: TiffFile(*place, compression="zlib", compressionargs={"level": 1}, rowsperstrip=64)),
    "rice": (".fits", RiceFits),
}


def write_series(arguments, camera, index):
    """One series in every container."""
    level = max(index - 1, 0) / arguments.levels
    frames = camera.frames(index, level, arguments.frames * arguments.parts)
    for part in range(arguments.parts):
        out = []
        for container in arguments.containers:
            suffix, writer = WRITERS[container]
            path = arguments.folder / container / f"series_{index:03}_{part}{suffix}"
            out.append(writer(path, arguments.frames, (camera.height, camera.width)))
        for _ in range(arguments.frames):
            frame = next(frames)
            for writer in out:
                writer.add(frame)
        for writer in out:
            writer.close()


def session_text(arguments, container, parts):
    text = ["schema = 1\n\n[camera]\nbit_depth = 16\n"]
    for index in range(arguments.levels + 2):
        kind, exposure_s = ("bias", 0.0) if index == 0 else ("dark", 0.02) if index == 1 else ("flat", 0.001 * (index - 1))
        files = ", ".join(f'"series_{index:03}_{part}{WRITERS[container][0]}"' for part in range(parts))
        text.append(f'\n[[series]]\nkind = "{kind}"\nexposure_s = {exposure_s:.3f}\nfiles = [{files}]\n')
    return "".join(text)


def share(arguments, first, step):
    camera = Camera(*arguments.size, arguments.even)
    for index in range(first, arguments.levels + 2, step):
        write_series(arguments, camera, index)


def main():
    parser = argparse.ArgumentParser(allow_abbrev=False)
    parser.add_argument("folder", type=pathlib.Path)
    parser.add_argument("--size", type=lambda text: tuple(map(int, text.split("x"))), required=True)
    parser.add_argument("--levels", type=int, required=True)
    parser.add_argument("--frames", type=int, required=True)
    parser.add_argument("--parts", type=int, default=1)
    parser.add_argument("--even", action="store_true")
    parser.add_argument("containers", nargs="+", choices=WRITERS)
    arguments = parser.parse_args()
    for container in arguments.containers:
        (arguments.folder / container).mkdir(parents=True, exist_ok=True)
    workers = len(os.sched_getaffinity(0))
    processes = [multiprocessing.Process(target=share, args=(arguments, first, workers)) for first in range(workers)]
    for process in processes:
        process.start()
    for process in processes:
        process.join()
    if any(process.exitcode for process in processes):
        raise SystemExit("make_session.py: a writer failed, expected all series written")
    for container in arguments.containers:
        for parts in {1, arguments.parts}:
            name = "session.toml" if arguments.parts == 1 else f"session_{parts}.toml"
            (arguments.folder / container / name).write_text(session_text(arguments, container, parts), encoding="ascii")


if __name__ == "__main__":
    main()
