"""Other readers and writers of TIFF and FITS, as witnesses for ours.

witness.py write FOLDER     writes files with tifffile and astropy, and prints one line a frame
witness.py read FILE...     prints one line a frame of files that we wrote

A line is: file name, page, pixel type, width, height, sum, mean, smallest, largest. The sum is exact for integers.
"""

import os
import sys
import warnings

import numpy
import tifffile
from astropy.io import fits

warnings.simplefilter("ignore")


def show(path, frames):
    for page, frame in enumerate(frames, 1):
        kind = frame.dtype.newbyteorder("=").name
        if frame.dtype.kind == "f":
            total = repr(float(frame.astype("float64").sum()))
        else:
            total = sum(int(row) for row in frame.astype("int64").sum(axis=1))
        mean = float(frame.astype("float64").mean())
        print(os.path.basename(path), page, kind, frame.shape[1], frame.shape[0], total, repr(mean),
              repr(float(frame.min())), repr(float(frame.max())))


def made_up(kind, random):
    shape = (3, 45, 70)
    if kind.startswith("float"):
        return random.normal(1000, 30, shape).astype(kind)
    limits = numpy.iinfo(kind)
    return random.integers(limits.min, limits.max, shape, dtype=kind, endpoint=True)


def write(folder):
    random = numpy.random.default_rng(20260101)
    for kind in ("uint8", "int8", "uint16", "int16", "uint32", "int32", "float32", "float64"):
        stack = made_up(kind, random)
        ways = {
            "plain": {},
            "strips": {"rowsperstrip": 7},
            "big_endian": {"byteorder": ">"},
            "bigtiff": {"bigtiff": True},
            "tiles": {"tile": (16, 32)},
            "deflate": {"compression": "zlib", "rowsperstrip": 11},
            "predictor": {"compression": "zlib", "predictor": True, "byteorder": ">"},
            "tiles_deflate": {"compression": "zlib", "tile": (32, 16)},
            "imagej": {"imagej": True},
        }
        for name, options in ways.items():
            if name == "imagej" and kind not in ("uint8", "uint16", "float32"):
                continue
            if name == "predictor" and kind.startswith("float"):
                continue
            path = os.path.join(folder, f"{kind}_{name}.tif")
            try:
                tifffile.imwrite(path, stack, photometric="minisblack", metadata=None if name != "imagej" else {}, **options)
            except (ValueError, KeyError) as reason:  # a codec that this tifffile has not
                print(f"skipped {name}: {reason}", file=sys.stderr)
                if os.path.exists(path):
                    os.remove(path)
                continue
            show(path, stack)
        path = os.path.join(folder, f"{kind}_cube.fits")
        fits.PrimaryHDU(stack).writeto(path)
        show(path, stack)
        path = os.path.join(folder, f"{kind}_cube.fits.gz")
        fits.PrimaryHDU(stack).writeto(path)
        show(path, stack)
        path = os.path.join(folder, f"{kind}_extensions.fits")
        fits.HDUList([fits.PrimaryHDU()] + [fits.ImageHDU(frame) for frame in stack]).writeto(path)
        show(path, stack)
        for way in ("RICE_1", "GZIP_1", "GZIP_2"):
            # This astropy cannot compress signed bytes, nor floats without rounding except by gzip.
            if kind == "int8" or (kind.startswith("float") and way == "RICE_1"):
                continue
            path = os.path.join(folder, f"{kind}_{way}.fits")
            hdus = [fits.CompImageHDU(frame, compression_type=way, quantize_level=0) for frame in stack]
            fits.HDUList([fits.PrimaryHDU()] + hdus).writeto(path)
            show(path, stack)


def read(paths):
    for path in paths:
        if path.endswith(".fits"):
            frames = []
            with fits.open(path) as hdus:
                for hdu in hdus:
                    if hdu.data is not None:
                        frames.extend(hdu.data.reshape((-1,) + hdu.data.shape[-2:]))
                show(path, frames)
        else:
            with tifffile.TiffFile(path) as file:
                show(path, [page.asarray() for page in file.pages])


if __name__ == "__main__":
    if sys.argv[1] == "write":
        write(sys.argv[2])
    else:
        read(sys.argv[2:])
