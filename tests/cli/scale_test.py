"""The extremes: large frames, many frames, many series, many files, few descriptors. Sparse files, written by seeking: what
was never written reads as zero, so that the pixels that matter are few."""
import json
import os
import pathlib
import resource
import struct
import subprocess
import tempfile
import time
import unittest

import numpy

from sessions import PROGRAM


def write_tiff(path, width, height, frames, bits=16, fill=None):
    """Uncompressed pages (TIFF 6.0), each in one strip; `fill(frame)` gives the pixels, else the strip is a hole."""
    size = width * height * bits // 8
    with open(path, "wb") as out:
        out.write(struct.pack("<2sHI", b"II", 42, 8))
        entry_bytes = 2 + 9 * 12 + 4
        data = 8 + frames * entry_bytes
        for f in range(frames):
            tags = [(256, 4, width), (257, 4, height), (258, 3, bits), (259, 3, 1), (262, 3, 1), (273, 4, data + f * size),
                    (277, 3, 1), (278, 4, height), (279, 4, size)]
            out.write(struct.pack("<H", 9) + b"".join(struct.pack("<HHII", tag, kind, 1, value) for tag, kind, value in tags))
            out.write(struct.pack("<I", 8 + (f + 1) * entry_bytes if f + 1 < frames else 0))
        for f in range(frames if fill else 0):
            out.seek(data + f * size)
            out.write(fill(f))
        out.truncate(data + frames * size)


def noisy(seed, mean, width, height, kind="<u2"):
    """Frames of Poisson light at two codes an electron over an offset of 100."""
    generator = numpy.random.default_rng(seed)
    return lambda _: (100 + 2 * generator.poisson(mean, (height, width))).astype(kind).tobytes()


class Scale(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)

    def measure(self, series, descriptors=None):
        """Seconds, peak kB and result.json of a session of (kind, exposure, glob)."""
        text = "schema = 1\n[camera]\nbit_depth = 16\n" + "".join(
            f'[[series]]\nkind = "{kind}"\nexposure_s = {exposure}\nfiles = ["{name}"]\n' for kind, exposure, name in series)
        (self.folder / "session.toml").write_text(text, encoding="utf-8")
        limit = (lambda: resource.setrlimit(resource.RLIMIT_NOFILE, (descriptors, descriptors))) if descriptors else None
        begin = time.monotonic()
        process = subprocess.Popen([PROGRAM, "measure", self.folder / "session.toml", "--out", self.folder / "out", "--plots",
                                    "none", "--quiet", "--threads", "2"], preexec_fn=limit)
        _, status, usage = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        self.assertEqual(process.returncode, 0)
        result = json.loads((self.folder / "out" / "result.json").read_text(encoding="utf-8"))
        return time.monotonic() - begin, usage.ru_maxrss, result

    def test_frames_of_150_megapixels(self):
        for name in ("dark", "flat"):
            write_tiff(self.folder / f"{name}.tif", 15000, 10000, 2)
        seconds, kilobytes, result = self.measure([("dark", 0.1, "dark.tif"), ("flat", 0.1, "flat.tif")])
        self.assertEqual(len(result["frames"]), 4)
        self.assertLess(seconds, 30)
        self.assertLess(kilobytes, 120_000)

    def test_memory_of_a_series_of_32_frames_is_that_of_8(self):
        peaks = []
        for frames in (8, 32):
            for name in ("dark", "flat"):
                write_tiff(self.folder / f"{name}.tif", 2048, 2048, frames)
            peaks.append(min(self.measure([("dark", 0.1, "dark.tif"), ("flat", 0.1, "flat.tif")])[1] for _ in range(3)))
        self.assertLess(peaks[1], 120_000)
        self.assertLess(peaks[1] - peaks[0], 1_000)

    def test_a_thousand_frames_in_a_series_and_every_width_of_pixel(self):
        for bits, kind, mean in ((8, "u1", 20), (16, "<u2", 500), (32, "<u4", 500)):
            write_tiff(self.folder / "dark.tif", 64, 64, 1000, bits, noisy(1, 0, 64, 64, kind))
            write_tiff(self.folder / "flat.tif", 64, 64, 1000, bits, noisy(2, mean, 64, 64, kind))
            _, _, result = self.measure([("dark", 0.1, "dark.tif"), ("flat", 0.1, "flat.tif")])
            gain = next(q for q in result["quantities"] if q["name"] == "conversion_gain_dn_per_e")
            # 999 x 4096 differences: the variance is known to 0.1 %.
            self.assertAlmostEqual(gain["value"], 2.0, delta=0.02, msg=f"{bits} bits")

    def test_two_hundred_series(self):
        series = []
        for number in range(200):
            mean = 10 * max(0, number - 1)
            write_tiff(self.folder / f"s{number}.tif", 64, 64, 2, 16, noisy(number, mean, 64, 64))
            series.append(("dark" if number < 2 else "flat", 0.1 * max(1, number), f"s{number}.tif"))
        seconds, _, result = self.measure(series)
        self.assertEqual(len(result["frames"]), 400)
        self.assertLess(seconds, 20)

    def test_ten_thousand_files_and_64_descriptors(self):
        fill = noisy(3, 300, 32, 32)
        for number in range(10000):
            write_tiff(self.folder / f"{'dark' if number < 2000 else 'flat'}_{number:05}.tif", 32, 32, 1, 16,
                       (lambda _: struct.pack("<1024H", *[100 + number % 2] * 1024)) if number < 2000 else fill)
        for descriptors in (None, 64):
            seconds, _, result = self.measure([("dark", 0.1, "dark_*.tif"), ("flat", 0.1, "flat_*.tif")], descriptors)
            self.assertEqual(len(result["frames"]), 10000)
            self.assertLess(seconds, 20)


if __name__ == "__main__":
    unittest.main()
