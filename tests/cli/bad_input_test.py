"""Input that cannot be used ends with exit status 3 and one line that says where, what was found, what was expected;
nothing is written."""
import pathlib
import tempfile
import unittest

import numpy
import tifffile
from sessions import WIDTH, HEIGHT, edit, good_session, line_of, run, write_fits, write_tiff

LOW = 'kind = "flat"\nexposure_s = 0.01\n'


def cut(path, share):
    data = path.read_bytes()
    path.write_bytes(data[:int(len(data) * share)])


def without(session, *names):
    """Takes series out of the session file."""
    blocks = session.read_text(encoding="utf-8").split("\n[[series]]")
    kept = [block for block in blocks if not any(f'"{name}.' in block for name in names)]
    session.write_text("\n[[series]]".join(kept), encoding="utf-8")


# Each case spoils the good session in one way and names what the line must hold, as regular expressions; {line} is
# the line of the session file with the text of `at`.
CASES = []


def case(name, *expected, at=None):
    def register(spoil):
        CASES.append((name, spoil, expected, at))
        return spoil
    return register


@case("a missing session file", r"session\.toml")
def _(session):
    session.unlink()


@case("a session file that is no TOML", r"session\.toml, line 4\b")
def _(session):
    edit(session, "[camera]", "[camera")


@case("a session file without a schema", r"session\.toml.*schema", "expected.*1")
def _(session):
    edit(session, "schema = 1\n", "")


@case("a schema of another version", r"session\.toml, line 1.*schema", "found 7", "expected.*1")
def _(session):
    edit(session, "schema = 1\n", "schema = 7\n")


@case("a missing file", r"session\.toml, line {line}\b", "files", r"flat_gone\.tif", at="flat_gone")
def _(session):
    edit(session, "flat_low.tif", "flat_gone.tif")


@case("a glob that matches nothing", r"session\.toml, line {line}\b", "files", r"none_\*\.tif", at="none_*")
def _(session):
    edit(session, "flat_low.tif", "none_*.tif")


@case("an unknown key", r"session\.toml, line {line}\b", r"series\[0\]\.exposure\b|series\[1\]\.exposure\b",
      "exposure_s", at="exposure = 3")
def _(session):
    edit(session, LOW, LOW + "exposure = 3\n")


@case("an unknown table", r"session\.toml, line {line}\b", "camra", "camera", at="[camra]")
def _(session):
    edit(session, "[camera]", "[camra]")


@case("a wrong type", r"session\.toml, line {line}\b", "exposure_s", "found.*fast", "expected.*number", at="fast")
def _(session):
    edit(session, "exposure_s = 0.01\n", 'exposure_s = "fast"\n')


@case("a word outside the list", r"session\.toml, line {line}\b", "kind", "found.*falt", "expected.*flat", at="falt")
def _(session):
    edit(session, LOW, LOW.replace("flat", "falt"))


@case("a negative exposure", r"session\.toml, line {line}\b", "exposure_s", r"found -0\.01", "expected.*0", at="-0.01")
def _(session):
    edit(session, "exposure_s = 0.01\n", "exposure_s = -0.01\n")


@case("an empty list of files", r"session\.toml, line {line}\b", "files", "found", at="files = []")
def _(session):
    edit(session, 'files = ["flat_low.tif"]', "files = []")


@case("a session without series", r"session\.toml", "series", "found.*(no|0)")
def _(session):
    text = session.read_text(encoding="utf-8")
    session.write_text(text[:text.index("\n[[series]]")], encoding="utf-8")


@case("a flat without a dark", r"session\.toml, line \d+", "series", "found no dark", "expected at least one")
def _(session):
    without(session, "bias", "dark")


@case("frames of different size", r"dark\.tif", rf"found.*{WIDTH // 2} x {HEIGHT}", rf"expected.*{WIDTH} x {HEIGHT}")
def _(session):
    write_tiff(session.parent / "dark.tif", numpy.full((8, HEIGHT, WIDTH // 2), 100, numpy.uint16))


@case("frames of different type", r"dark\.tif", "found.*8", "expected.*16")
def _(session):
    write_tiff(session.parent / "dark.tif", numpy.full((8, HEIGHT, WIDTH), 100, numpy.uint8))


@case("pages of different size in one file", r"dark\.tif, page 2", rf"found.*{WIDTH // 2} x {HEIGHT}")
def _(session):
    with tifffile.TiffWriter(session.parent / "dark.tif") as writer:
        writer.write(numpy.full((HEIGHT, WIDTH), 100, numpy.uint16), metadata=None)
        writer.write(numpy.full((HEIGHT, WIDTH // 2), 100, numpy.uint16), metadata=None)


@case("colour frames", r"dark\.tif, page 1", "found 3", "expected 1")
def _(session):
    tifffile.imwrite(session.parent / "dark.tif", numpy.full((HEIGHT, WIDTH, 3), 100, numpy.uint16),
                     photometric="rgb", metadata=None)


@case("a truncated TIFF", r"flat_high\.tif")
def _(session):
    cut(session.parent / "flat_high.tif", 0.6)


@case("a truncated FITS", r"flat_high\.fits", r"found \d+", r"expected.*\d+")
def _(session):
    flat = session.parent / "flat_high.tif"
    write_fits(flat.with_suffix(".fits"), numpy.full((4, HEIGHT, WIDTH), 2000, numpy.uint16))
    cut(flat.with_suffix(".fits"), 0.6)
    edit(session, "flat_high.tif", "flat_high.fits")


@case("a FITS without an image", r"bias\.fits")
def _(session):
    cards = ["SIMPLE  =                    T", "BITPIX  =                    8", "NAXIS   =                    0", "END"]
    header = "".join(card.ljust(80) for card in cards).ljust(2880)
    (session.parent / "bias.fits").write_text(header, encoding="ascii")
    edit(session, "bias.tif", "bias.fits")


@case("a file without a byte", r"bias\.tif")
def _(session):
    (session.parent / "bias.tif").write_bytes(b"")


@case("a file that is neither TIFF nor FITS", r"bias\.tif", "expected.*TIFF.*FITS")
def _(session):
    (session.parent / "bias.tif").write_text("not a picture at all\n" * 50, encoding="ascii")


REGION = '\n[[region]]\nname = "{name}"\nx = {x}\ny = 0\nwidth = {width}\nheight = {height}\n\n[[series]]'


def add_region(session, **values):
    text = session.read_text(encoding="utf-8")
    session.write_text(text.replace("\n[[series]]", REGION.format(**values), 1), encoding="utf-8")


@case("a region outside the frame", r"session\.toml, line \d+", "region", "found", rf"expected.*{WIDTH}")
def _(session):
    add_region(session, name="left", x=WIDTH // 2, width=WIDTH, height=HEIGHT)


@case("a region of negative width", r"session\.toml, line {line}\b", "width", "found -5", at="width = -5")
def _(session):
    add_region(session, name="left", x=0, width=-5, height=HEIGHT)


@case("a name that would steer the terminal", r"session\.toml, line {line}\b", r"\\x1b|\\u001[bB]", at="u001b")
def _(session):
    edit(session, "flat_low.tif", r"\u001b[31mred.tif")


class BadInput(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)

    def test_the_session_that_the_cases_spoil_is_good(self):
        answer = run("measure", good_session(self.folder / "in"), "--out", self.folder / "out")
        self.assertEqual(answer.returncode, 0, answer.stderr)


def test_of(spoil, expected, at):
    def test(self):
        session = good_session(self.folder / "in")
        spoil(session)
        line = line_of(session, at) if at else ""
        answer = run("measure", session, "--out", self.folder / "out")
        self.assertEqual(answer.returncode, 3, answer.stderr)
        self.assertEqual(answer.stdout, "")
        self.assertEqual(len(answer.stderr.splitlines()), 1, answer.stderr)
        self.assertNotRegex(answer.stderr.rstrip("\n"), r"[\x00-\x1f\x7f]")
        for pattern in (*expected, "found", "expected"):
            self.assertRegex(answer.stderr, pattern.replace("{line}", str(line)))
        self.assertEqual([path.name for path in self.folder.iterdir()], ["in"], "nothing may be left behind")
    return test


for case_name, case_spoil, case_expected, case_at in CASES:
    setattr(BadInput, "test_" + case_name.replace(" ", "_"), test_of(case_spoil, case_expected, case_at))

if __name__ == "__main__":
    unittest.main()
