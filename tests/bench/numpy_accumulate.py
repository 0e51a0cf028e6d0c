#!/usr/bin/python3
"""Mean [DN] and temporal variance [DN^2] of each 16-bit stack, a line for each file, as careful NumPy has them: mapped into
memory where the file allows it, frame by frame, exact integer sums, and no array made twice.

    numpy_accumulate.py FILE..."""
import sys

import numpy as np


def tiff_frames(path):
    """Frames and the number to add to their pixels."""
    import tifffile
    with tifffile.TiffFile(path) as tiff:
        for page in tiff.pages:
            if page.is_memmappable:
                yield np.memmap(path, tiff.byteorder + "u2", "r", page.dataoffsets[0], page.shape), 0
            else:
                yield page.asarray(), 0


def fits_frames(path):
    """The same; uncompressed ones stay mapped, so the zero point is left to the caller."""
    from astropy.io import fits
    with fits.open(path, memmap=True, do_not_scale_image_data=True) as hdus:
        for hdu in hdus:
            if hdu.data is not None:
                zero = 0 if hdu.data.dtype.kind == "u" else int(hdu.header.get("BZERO", 0))
                for plane in hdu.data if hdu.data.ndim == 3 else hdu.data[None]:
                    yield plane, zero


def mean_and_variance(frames):
    count = 0
    for plane, zero in frames:
        if count == 0:
            x = np.empty(plane.shape, np.uint32)
            total = np.zeros(plane.shape, np.uint32)
            square = np.zeros(plane.shape, np.uint64)
        if zero:
            np.add(plane, zero, out=x, dtype=np.int32, casting="unsafe")
        else:
            np.copyto(x, plane)
        total += x
        np.multiply(x, x, out=x)  # 65535^2 just fits
        square += x
        count += 1
    mean = total / count
    total = total * mean
    return mean.mean(), (square.sum(dtype=np.float64) - total.sum()) / (count - 1) / mean.size


for name in sys.argv[1:]:
    print("%.4f %.4f" % mean_and_variance(fits_frames(name) if name.endswith(".fits") else tiff_frames(name)))
