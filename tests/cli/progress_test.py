"""What stands on a terminal while frames are read, that nothing of it reaches a pipe, and that an interrupt ends the work
within a second, wherever it is, and leaves nothing."""
import os
import pathlib
import pty
import re
import signal
import struct
import subprocess
import tempfile
import threading
import time
import unittest
import zlib

from sessions import PROGRAM, good_session, run

SIDE = 8192  # pixels; frames of 134 MB of which each decodes for some tenths of a second


def large_deflate_stack(path, frames, one_strip):
    """A BigTIFF of 16-bit frames packed with deflate, all pages of the same bytes. TIFF 6.0, sections 2, 3 and 8."""
    row = bytes(range(256)) * (SIDE * 2 // 256)
    rows = SIDE if one_strip else 64
    packed = zlib.compress(row * rows, 1)
    strips = SIDE // rows
    with open(path, "wb") as out:
        out.write(struct.pack("<2sHHHQ", b"II", 43, 8, 0, 0) + packed)
        lists = out.tell()
        out.write(struct.pack("<Q", 16) * strips + struct.pack("<Q", len(packed)) * strips)
        link = 8
        for _ in range(frames):
            place = out.tell()
            tags = [(256, 4, 1, SIDE), (257, 4, 1, SIDE), (258, 3, 1, 16), (259, 3, 1, 8), (262, 3, 1, 1),
                    (273, 16, strips, 16 if strips == 1 else lists), (277, 3, 1, 1), (278, 4, 1, rows),
                    (279, 16, strips, len(packed) if strips == 1 else lists + 8 * strips)]
            out.write(struct.pack("<Q", len(tags)) + b"".join(struct.pack("<HHQQ", *tag) for tag in tags))
            next_link = out.tell()
            out.write(struct.pack("<Q", 0))
            out.seek(link)
            out.write(struct.pack("<Q", place))
            out.seek(0, os.SEEK_END)
            link = next_link


def long_session(folder, one_strip=False):
    """Frames that take many seconds to decode."""
    for name in ("dark", "flat"):
        large_deflate_stack(folder / f"{name}.tif", 60, one_strip)
    session = folder / "session.toml"
    session.write_text('schema = 1\n[[series]]\nkind = "dark"\nexposure_s = 0.1\nfiles = ["dark.tif"]\n'
                       '[[series]]\nkind = "flat"\nexposure_s = 0.1\nfiles = ["flat.tif"]\n', encoding="utf-8")
    return session


class Terminal:
    """A program whose messages go to a terminal that the test reads as they come."""

    def __init__(self, *arguments):
        leader, follower = pty.openpty()
        self.process = subprocess.Popen([PROGRAM, *map(str, arguments)], stdout=subprocess.DEVNULL, stderr=follower,
                                        stdin=subprocess.DEVNULL, start_new_session=True)
        os.close(follower)
        self.text = ""
        self.reader = threading.Thread(target=self._read, args=(leader,))
        self.reader.start()

    def _read(self, leader):
        while True:
            try:
                part = os.read(leader, 65536)
            except OSError:  # Linux's end of file on a terminal whose other end is closed
                break
            if not part:
                break
            self.text += part.decode("utf-8", "replace")
        os.close(leader)

    def wait_for(self, pattern, seconds=40):
        deadline = time.monotonic() + seconds
        while not re.search(pattern, self.text) and self.process.poll() is None and time.monotonic() < deadline:
            time.sleep(0.02)
        return re.search(pattern, self.text)

    def interrupt(self):
        """Exit status and seconds from Ctrl-C to the end."""
        begin = time.monotonic()
        self.process.send_signal(signal.SIGINT)
        status = self.process.wait(timeout=60)
        took = time.monotonic() - begin
        self.reader.join()
        return status, took


class Progress(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)

    def test_a_terminal_shows_stage_series_and_time_left_and_an_interrupt_leaves_nothing(self):
        session = long_session(self.folder)
        terminal = Terminal("measure", session, "--out", self.folder / "out")
        shown = terminal.wait_for(r"reading frames: \d of 2 series, \d+ %, about \d+ s left")
        status, took = terminal.interrupt()
        self.assertTrue(shown, terminal.text)
        self.assertEqual(status, 130)
        self.assertLess(took, 1.0)
        self.assertTrue(terminal.text.rstrip().endswith("evenfield: interrupted"), terminal.text[-200:])
        self.assertEqual(sorted(path.name for path in self.folder.iterdir()), ["dark.tif", "flat.tif", "session.toml"])
        # No guess in the first two seconds; percentages never go back.
        percents = [int(number) for number in re.findall(r"series, (\d+) %", terminal.text)]
        self.assertEqual(percents, sorted(percents))
        self.assertNotIn("left", terminal.text.split("%")[1])

    def test_an_interrupt_is_seen_in_the_middle_of_a_frame_packed_in_one_piece(self):
        terminal = Terminal("measure", long_session(self.folder, one_strip=True), "--out", self.folder / "out")
        terminal.wait_for("reading frames")
        time.sleep(0.5)
        status, took = terminal.interrupt()
        self.assertEqual(status, 130)
        self.assertLess(took, 1.0)

    def test_a_pipe_gets_nothing_unless_it_is_asked_for(self):
        session = good_session(self.folder / "in")
        answer = run("measure", session, "--out", self.folder / "out", "--plots", "none")
        self.assertEqual((answer.returncode, answer.stderr), (0, ""))
        answer = run("measure", session, "--out", self.folder / "out", "--plots", "none", "--progress", "always")
        self.assertEqual(answer.returncode, 0)
        self.assertRegex(answer.stderr, "starting|reading|analysing|writing")  # the stage at the moment of drawing
        self.assertTrue(answer.stderr.endswith("\033[K"), "the line is taken away at the end")


if __name__ == "__main__":
    unittest.main()
