"""Small sessions for the tests of the command line, and how the program is run on them."""
import os
import pathlib
import re
import subprocess

import numpy
import tifffile

ROOT = pathlib.Path(__file__).resolve().parents[2]
PROGRAM = os.environ.get("EVENFIELD_PROGRAM", str(ROOT / "build" / "release" / "bin" / "evenfield"))

WIDTH, HEIGHT = 48, 40
GAIN_DN_PER_E = 0.5
OFFSET_DN = 100.0
READ_NOISE_E = 4.0
FLATS = {"low": (0.01, 400), "middle": (0.04, 1600), "high": (0.10, 4000)}  # exposure [s], mean [e-]
DARKS = {"bias": 0.0, "dark": 0.10}  # exposure [s]


def run(*arguments, timeout=120, **options):
    """The program's answer: returncode, stdout, stderr."""
    return subprocess.run([PROGRAM, *map(str, arguments)], capture_output=True, text=True, timeout=timeout,
                          check=False, stdin=subprocess.DEVNULL, **options)


def frames(mean_e, count, generator, width=WIDTH, height=HEIGHT):
    """Frames of an even camera with Poisson light, as 16-bit numbers."""
    electrons = generator.poisson(mean_e, (count, height, width))
    electrons = electrons + generator.normal(0, READ_NOISE_E, electrons.shape)
    return numpy.rint(OFFSET_DN + GAIN_DN_PER_E * electrons).astype(numpy.uint16)


def write_tiff(path, stack):
    tifffile.imwrite(path, stack, photometric="minisblack", metadata=None)


def write_fits(path, stack):
    """A FITS cube of unsigned 16-bit numbers, written here byte by byte after the FITS standard, 4.0, 3.3 and 4.4."""
    cards = ["SIMPLE  =                    T", "BITPIX  =                   16", f"NAXIS   = {stack.ndim:20d}"]
    cards += [f"NAXIS{axis + 1:<3d}= {size:20d}" for axis, size in enumerate(reversed(stack.shape))]
    cards += ["BSCALE  =                  1.0", "BZERO   =              32768.0", "END"]
    header = "".join(card.ljust(80) for card in cards).encode("ascii")
    data = (stack.astype(numpy.int32) - 32768).astype(">i2").tobytes()
    path.write_bytes(header + b" " * (-len(header) % 2880) + data + b"\0" * (-len(data) % 2880))


SERIES = """
[[series]]
kind = "{kind}"
exposure_s = {exposure}
files = ["{files}"]
"""


def good_session(folder, extension="tif"):
    """Writes three flat levels and two darks into `folder` with their session.toml; returns its path."""
    folder = pathlib.Path(folder)
    folder.mkdir(parents=True, exist_ok=True)
    generator = numpy.random.default_rng(20261124)
    write = write_tiff if extension == "tif" else write_fits
    text = 'schema = 1\nacquired = 2026-11-24T09:30:00Z\n\n[camera]\nlabel = "made up"\nbit_depth = 16\n'
    for name, (exposure, mean_e) in FLATS.items():
        write(folder / f"flat_{name}.{extension}", frames(mean_e, 4, generator))
        text += SERIES.format(kind="flat", exposure=exposure, files=f"flat_{name}.{extension}")
    for name, exposure in DARKS.items():
        write(folder / f"{name}.{extension}", frames(0, 8, generator))
        text += SERIES.format(kind=name, exposure=exposure, files=f"{name}.{extension}")
    session = folder / "session.toml"
    session.write_text(text, encoding="utf-8")
    return session


def edit(session, old, new):
    """Replaces the one place where `old` stands in the session file."""
    text = session.read_text(encoding="utf-8")
    assert text.count(old) == 1, f"{old!r} stands {text.count(old)} times in the session file"
    session.write_text(text.replace(old, new), encoding="utf-8")


def line_of(session, needle):
    """Number, from 1, of the line of the session file that holds `needle`."""
    lines = session.read_text(encoding="utf-8").splitlines()
    return next(number for number, line in enumerate(lines, 1) if needle in line)


def without_created(result_json):
    """The bytes of result.json less the time of processing."""
    text, count = re.subn(rb'"created": ?"[^"]*"', b"", pathlib.Path(result_json).read_bytes())
    assert count == 1, "result.json has no time of processing"
    return text


def files_below(folder):
    return sorted(str(path.relative_to(folder)) for path in pathlib.Path(folder).rglob("*") if path.is_file())
