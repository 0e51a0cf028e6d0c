"""The sample session in other containers, written by tifffile and astropy, gives the same numbers."""
import json
import pathlib
import tempfile
import unittest

import numpy as np
import tifffile
from astropy.io import fits

from sessions import ROOT, run

SAMPLE = ROOT / "sample_frames" / "tiff"


def pages(**how):
    """A writer of TIFF stacks, page by page."""
    container = {key: how.pop(key) for key in ("bigtiff", "byteorder") if key in how}
    dtype = how.pop("dtype", None)

    def write(path, stack):
        with tifffile.TiffWriter(path, **container) as out:
            for frame in stack:
                out.write(frame.astype(dtype or stack.dtype), contiguous=False, photometric="minisblack", **how)
    return ".tif", write


def hdus(make, suffix=".fits"):
    return suffix, lambda path, stack: fits.HDUList(make(stack)).writeto(path)


def compressed(kind):
    return hdus(lambda stack: [fits.PrimaryHDU()] + [fits.CompImageHDU(f, compression_type=kind) for f in stack])


CONTAINERS = {
    "one TIFF page a frame": pages(),
    "one TIFF block a stack": (".tif", lambda path, stack: tifffile.imwrite(path, stack, photometric="minisblack")),
    "BigTIFF": pages(bigtiff=True),
    "big-endian TIFF": pages(byteorder=">"),
    "deflate": pages(compression="zlib"),
    "deflate with predictor": pages(compression="zlib", predictor=True),
    "tiles": pages(tile=(32, 32)),
    "strips of seven rows": pages(rowsperstrip=7),
    "32 bit float TIFF": pages(dtype=np.float32),
    "unsigned 32 bit TIFF": pages(dtype=np.uint32),
    "FITS cube": hdus(lambda stack: [fits.PrimaryHDU(stack)]),
    "FITS cube in gzip": hdus(lambda stack: [fits.PrimaryHDU(stack)], ".fits.gz"),
    "signed 16 bit FITS": hdus(lambda stack: [fits.PrimaryHDU(stack.astype(np.int16))]),
    "32 bit float FITS": hdus(lambda stack: [fits.PrimaryHDU(stack.astype(np.float32))]),
    "FITS extensions": hdus(lambda stack: [fits.PrimaryHDU()] + [fits.ImageHDU(f) for f in stack]),
    "Rice tiles": compressed("RICE_1"),
    "gzip tiles": compressed("GZIP_1"),
}


class Containers(unittest.TestCase):
    def quantities(self, session, out):
        answer = run("measure", session, "--out", out, "--plots", "none", "--quiet")
        self.assertEqual(answer.returncode, 0, answer.stderr)
        result = json.loads((out / "result.json").read_text(encoding="utf-8"))
        self.assertTrue(any(quantity["value"] for quantity in result["quantities"]))
        return {quantity["name"]: quantity for quantity in result["quantities"]}

    def test_the_same_frames_give_the_same_numbers(self):
        text = (SAMPLE / "session.toml").read_text(encoding="utf-8")
        with tempfile.TemporaryDirectory() as scratch:
            scratch = pathlib.Path(scratch)
            reference = self.quantities(SAMPLE / "session.toml", scratch / "reference")
            for number, (name, (suffix, write)) in enumerate(CONTAINERS.items()):
                with self.subTest(name):
                    folder = scratch / str(number)
                    folder.mkdir()
                    for file in sorted(SAMPLE.glob("*.tif")):
                        write(folder / (file.stem + suffix), tifffile.imread(file))
                    (folder / "session.toml").write_text(text.replace('.tif"', suffix + '"'), encoding="utf-8")
                    found = self.quantities(folder / "session.toml", folder / "out")
                    self.assertEqual(found.keys(), reference.keys())
                    for key, quantity in reference.items():
                        for field in ("value", "standard_uncertainty", "low95", "high95"):
                            if quantity[field] is None:
                                self.assertIsNone(found[key][field])
                            else:
                                # Sums of floats are rounded where those of integers are exact.
                                self.assertAlmostEqual(found[key][field], quantity[field], msg=f"{key} {field}",
                                                       delta=1e-9 * abs(quantity[field]) + 1e-15)


if __name__ == "__main__":
    unittest.main()
