"""A session at size: 2048 x 2048 pixels of 16 bits, twelve levels of eight frames and darks, 0.9 GB. Memory, speed and the
same result for any number of threads."""
import json
import os
import pathlib
import subprocess
import sys
import tempfile
import time
import unittest

from sessions import PROGRAM, without_created

SIDE, FRAMES, LEVELS = 2048, 8, 12


def make_session(folder):
    """Frames of 0.9 GB in all, and their session file."""
    import numpy as np
    import tifffile
    random = np.random.default_rng(1)
    series = ["schema = 1\n[camera]\nbit_depth = 16\n"]
    radius = np.linspace(-1, 1, SIDE) ** 2
    light = 1 - 0.25 * (radius[:, None] + radius[None, :])
    for level in range(LEVELS + 2):
        electrons = 0.0 if level < 2 else 2200.0 * (level - 1)
        # Noise of one frame, moved by another distance for each: independent pixel by pixel, and quick to make.
        frame = 100 + 2 * random.poisson(electrons * light) if electrons else 100.0
        frame = np.rint(frame + random.normal(0, 3, (SIDE, SIDE)))
        mean = 100 + 2 * electrons * light
        with tifffile.TiffWriter(folder / f"series_{level:02}.tif") as out:
            for k in range(FRAMES):
                noise = np.roll((frame - mean) / np.sqrt(np.maximum(mean, 100)), (97 * k, 31 * k), (0, 1))
                drift = 1 + 0.01 * random.normal() if electrons else 1.0
                pixels = 100 + drift * (mean - 100) + noise * np.sqrt(np.maximum(mean, 100))
                if electrons:
                    pixels[random.integers(0, SIDE, 12), random.integers(0, SIDE, 12)] += 3000
                out.write(np.clip(np.rint(pixels), 0, 65535).astype(np.uint16), contiguous=False)
        kind = "bias" if level == 0 else "dark" if level == 1 else "flat"
        exposure = "" if level == 0 else f"exposure_s = {0.1 if level == 1 else 0.01 * (level - 1)}\n"
        series.append(f'[[series]]\nkind = "{kind}"\n{exposure}files = ["series_{level:02}.tif"]\n')
    (folder / "session.toml").write_text("".join(series), encoding="utf-8")


class AtSize(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.scratch = tempfile.TemporaryDirectory()
        cls.folder = pathlib.Path(cls.scratch.name)
        # In a process of its own: the peak of a child's memory counts what its parent had when it began.
        subprocess.run([sys.executable, "-B", __file__, "--make", cls.folder], check=True)
        cls.bytes = sum(file.stat().st_size for file in cls.folder.glob("*.tif"))

    @classmethod
    def tearDownClass(cls):
        cls.scratch.cleanup()

    def measure(self, threads):
        """Seconds, seconds of CPU and peak kB of one run; its result without the time of its making."""
        out = self.folder / f"out_{threads}"
        begin = time.monotonic()
        process = subprocess.Popen([PROGRAM, "measure", self.folder / "session.toml", "--out", out, "--plots", "none",
                                    "--quiet", "--threads", str(threads)])
        _, status, usage = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        self.assertEqual(process.returncode, 0)
        return (time.monotonic() - begin, usage.ru_utime + usage.ru_stime, usage.ru_maxrss,
                without_created(out / "result.json"))

    def test_memory_speed_and_threads(self):
        runs = [self.measure(threads) for threads in (2, 1, 3, 2, 2)]
        for _, _, kilobytes, result in runs:
            self.assertLess(kilobytes, 200_000)
            self.assertEqual(result, runs[0][3])
        wall = min(run[0] for run in (runs[0], runs[3], runs[4]))
        cpu = min(run[1] for run in runs)
        print(f"{self.bytes / 1e9:.2f} GB: {self.bytes / wall / 1e9:.2f} GB/s, {self.bytes / cpu / 1e9:.2f} GB per CPU "
              f"second, {max(run[2] for run in runs) / 1000:.0f} MB")
        # Other work on the machine takes wall time but not CPU time; two cores give twice the bytes of a CPU second.
        self.assertGreater(2 * self.bytes / cpu / 1e9, 1.5)
        quantities = {q["name"]: q for q in json.loads((self.folder / "out_2" / "result.json").read_text())["quantities"]}
        # Noise was drawn at the mean light and scaled by its root: 1.0 +- what 12 levels of 29 million pixels leave.
        self.assertAlmostEqual(quantities["conversion_gain_dn_per_e"]["value"], 2.0, delta=0.02)


if __name__ == "__main__":
    if sys.argv[1:2] == ["--make"]:
        make_session(pathlib.Path(sys.argv[2]))
    else:
        unittest.main()
