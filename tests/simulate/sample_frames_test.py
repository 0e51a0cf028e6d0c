"""The frames in sample_frames/ are what the simulator makes of sample_frames/scene.toml, and small."""
import os
import pathlib
import subprocess
import unittest

import numpy
import tifffile
from astropy.io import fits

ROOT = pathlib.Path(__file__).resolve().parents[2]
SAMPLES = ROOT / "sample_frames"


class SampleFrames(unittest.TestCase):
    def test_they_are_made_anew_byte_for_byte(self):
        program = os.environ.get("EVENFIELD_PROGRAM", str(ROOT / "build" / "release" / "bin" / "evenfield"))
        answer = subprocess.run([ROOT / "scripts" / "make_sample_frames", "--check"], capture_output=True, text=True,
                                env={**os.environ, "EVENFIELD_PROGRAM": program}, check=False)
        self.assertEqual((answer.returncode, answer.stdout), (0, ""), answer.stderr)

    def test_other_readers_find_the_same_pixels_in_both_formats(self):
        stacks = sorted((SAMPLES / "tiff").glob("*.tif"))
        self.assertEqual(len(stacks), 20)
        for path in stacks:
            with self.subTest(path.name):
                with fits.open(SAMPLES / "fits" / path.with_suffix(".fits").name) as file:
                    numpy.testing.assert_array_equal(tifffile.imread(path), file[0].data)

    def test_the_levels_span_the_range(self):
        means = [tifffile.imread(path).mean() for path in sorted((SAMPLES / "tiff").glob("flat_*.tif"))]
        offset = tifffile.imread(SAMPLES / "tiff" / "bias_01.tif").mean()
        share = (numpy.array(means) - offset) / (4095 - offset)
        self.assertGreaterEqual(numpy.sum((share > 0.05) & (share < 0.95)), 8)
        self.assertGreaterEqual(numpy.sum(share < 0.7), 6)
        self.assertGreaterEqual(numpy.sum(share > 0.99), 2)

    def test_they_are_small(self):
        self.assertLess(sum(path.stat().st_size for path in SAMPLES.rglob("*") if path.is_file()), 12_000_000)


if __name__ == "__main__":
    unittest.main()
