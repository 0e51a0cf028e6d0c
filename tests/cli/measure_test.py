"""evenfield measure: what it writes, where it refuses to write, and what must not change the result."""
import csv
import json
import os
import pathlib
import pty
import shutil
import signal
import subprocess
import tempfile
import time
import unittest

from sessions import (GAIN_DN_PER_E, OFFSET_DN, PROGRAM, READ_NOISE_E, ROOT, edit, files_below, good_session, run,
                      without_created)

SAMPLES = ROOT / "sample_frames"
TABLES = ["findings.csv", "quantities.csv", "report.html", "result.json", "series.csv"]


class Measure(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)
        self.out = self.folder / "out"

    def measure(self, session, *arguments, out=None):
        answer = run("measure", session, "--out", out or self.out, *arguments)
        self.assertEqual(answer.returncode, 0, answer.stderr)
        return answer

    def quantities(self, out=None):
        """Quantity objects of result.json by name; the session has one region."""
        result = json.loads(((out or self.out) / "result.json").read_text(encoding="utf-8"))
        return {quantity["name"]: quantity for quantity in result["quantities"]}

    def test_the_sample_session_gives_every_file_and_the_truth_of_its_camera(self):
        self.measure(SAMPLES / "tiff" / "session.toml")
        written = files_below(self.out)
        self.assertEqual([name for name in written if not name.startswith("plots/")], TABLES)
        for plot in ("photon_transfer", "response", "frame_means"):
            self.assertIn(f"plots/{plot}.svg", written)
            self.assertIn("<svg", (self.out / "plots" / f"{plot}.svg").read_text(encoding="utf-8"))
        realized = json.loads((SAMPLES / "tiff" / "truth.json").read_text(encoding="utf-8"))["realized"]
        gain = self.quantities()["conversion_gain_dn_per_e"]
        truth = find_number(realized, "conversion_gain_dn_per_e")
        self.assertLess(abs(gain["value"] - truth), 4 * gain["standard_uncertainty"])

    def test_tiff_and_fits_of_the_same_frames_give_the_same_numbers(self):
        self.measure(SAMPLES / "tiff" / "session.toml", "--plots", "none")
        self.measure(SAMPLES / "fits" / "session.toml", "--plots", "none", out=self.folder / "fits")
        self.assertEqual(self.quantities(), self.quantities(self.folder / "fits"))

    def test_the_small_session_gives_the_numbers_it_was_made_with(self):
        self.measure(good_session(self.folder / "in"))
        for name, truth in {"conversion_gain_dn_per_e": GAIN_DN_PER_E, "read_noise_e": READ_NOISE_E,
                            "dark_offset_dn": OFFSET_DN}.items():
            quantity = self.quantities()[name]
            with self.subTest(name):
                self.assertGreater(quantity["standard_uncertainty"], 0)
                self.assertLess(abs(quantity["value"] - truth), 4 * quantity["standard_uncertainty"])

    def test_one_and_three_threads_give_the_same_bytes(self):
        for number, session in enumerate([good_session(self.folder / "in"), SAMPLES / "tiff" / "session.toml"]):
            one, three = self.folder / f"one{number}", self.folder / f"three{number}"
            self.measure(session, "--threads", "1", out=one)
            self.measure(session, "--threads", "3", out=three)
            self.assertEqual(files_below(one), files_below(three))
            self.assertEqual(without_created(one / "result.json"), without_created(three / "result.json"))
            for name in files_below(one):
                if name.endswith((".csv", ".svg")):
                    self.assertEqual((one / name).read_bytes(), (three / name).read_bytes(), name)

    def test_a_moved_session_gives_the_same_result(self):
        session = good_session(self.folder / "in")
        self.measure(session, out=self.folder / "before")
        shutil.copytree(self.folder / "in", self.folder / "elsewhere" / "deeper")
        self.measure(self.folder / "elsewhere" / "deeper" / "session.toml", out=self.folder / "after")
        self.assertEqual(without_created(self.folder / "before" / "result.json"),
                         without_created(self.folder / "after" / "result.json"))

    def test_csv_and_json_say_the_same(self):
        self.measure(good_session(self.folder / "in"))
        with open(self.out / "quantities.csv", encoding="utf-8", newline="") as table:
            rows = {row["name"]: row for row in csv.DictReader(table)}
        quantities = self.quantities()
        self.assertEqual(list(rows), list(quantities))
        for name, quantity in quantities.items():
            for key in ("value", "standard_uncertainty", "low95", "high95"):
                self.assertEqual(rows[name][key] and float(rows[name][key]), quantity[key] if quantity[key] is not None else "",
                                 (name, key))
            self.assertTrue(quantity["value"] is not None or quantity["note"], f"{name} is null and does not say why")

    def test_plots_none_draws_none_and_one_name_draws_one(self):
        session = good_session(self.folder / "in")
        self.measure(session, "--plots", "none")
        self.assertEqual(files_below(self.out), TABLES)
        self.measure(session, "--plots", "response")
        self.assertEqual(files_below(self.out), sorted([*TABLES, "plots/response.svg"]))

    def test_without_gnuplot_the_run_still_ends_well_and_says_so(self):
        answer = subprocess.run([PROGRAM, "measure", good_session(self.folder / "in"), "--out", self.out], check=False,
                                capture_output=True, text=True, env={**os.environ, "PATH": str(self.folder)})
        self.assertEqual(answer.returncode, 0, answer.stderr)
        self.assertIn("gnuplot", answer.stderr)
        self.assertEqual(files_below(self.out), TABLES)

    def test_an_interrupt_ends_with_status_130_and_leaves_nothing(self):
        session = good_session(self.folder / "in")
        # A gnuplot that does not end holds the run at a known point.
        gnuplot, started = self.folder / "bin" / "gnuplot", self.folder / "in" / "started"
        gnuplot.parent.mkdir()
        gnuplot.write_text(f"#!/bin/sh\ntouch '{started}'\nexec sleep 60\n", encoding="ascii")
        gnuplot.chmod(0o755)
        environment = {**os.environ, "PATH": f"{gnuplot.parent}:{os.environ['PATH']}"}
        process = subprocess.Popen([PROGRAM, "measure", session, "--out", self.out], env=environment, start_new_session=True,
                                   stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        deadline = time.monotonic() + 60
        while not started.exists() and process.poll() is None and time.monotonic() < deadline:
            time.sleep(0.02)
        self.assertTrue(started.exists())
        os.killpg(process.pid, signal.SIGINT)  # as a terminal does it, to the program and its children
        self.assertEqual(process.wait(timeout=30), 130)
        self.assertEqual(sorted(path.name for path in self.folder.iterdir()), ["bin", "in"])

    def test_quiet_says_nothing_and_json_prints_the_result(self):
        session = good_session(self.folder / "in")
        self.assertEqual(self.measure(session, "--quiet").stderr, "")
        answer = self.measure(session, "--json", "--quiet")
        self.assertEqual(json.loads(answer.stdout)["schema"], "evenfield.result/1")

    def test_the_summary_on_standard_output_holds_the_headline_number(self):
        answer = self.measure(good_session(self.folder / "in"))
        self.assertRegex(answer.stdout, r"(?i)gain.*0\.[45]\d")

    def test_no_color_keeps_colour_off_a_terminal(self):
        session = good_session(self.folder / "in")
        for arguments in (["measure", session, "--out", self.out], ["measure", self.folder / "gone.toml", "--out", self.out]):
            text = on_terminal([PROGRAM, *map(str, arguments)], {**os.environ, "NO_COLOR": "1", "TERM": "xterm"})
            self.assertTrue(text)
            self.assertNotRegex(text, r"\x1b\[[0-9;]*m")

    def test_a_series_with_one_level_still_gives_a_gain(self):
        session = good_session(self.folder / "in")
        text = session.read_text(encoding="utf-8")
        kept = [block for block in text.split("\n[[series]]") if '"flat_low' not in block and '"flat_high' not in block]
        session.write_text("\n[[series]]".join(kept), encoding="utf-8")
        self.measure(session)
        gain = self.quantities()["conversion_gain_dn_per_e"]
        self.assertLess(abs(gain["value"] - GAIN_DN_PER_E), 4 * gain["standard_uncertainty"])

    def test_paths_with_spaces_quotes_and_letters_beyond_ascii_work(self):
        folder = self.folder / "bay 3; 'Prüfung' \"µ\""
        session = good_session(folder)
        (folder / "flat_low.tif").rename(folder / "flat 'ä'.tif")
        edit(session, "flat_low.tif", "flat 'ä'.tif")
        self.measure(session, out=folder / "out put")
        self.assertIn("flat 'ä'.tif", (folder / "out put" / "result.json").read_text(encoding="utf-8"))


class OutputFolder(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)
        self.session = good_session(self.folder / "in")
        self.out = self.folder / "out"

    def refuse(self, out, named=None):
        before = files_below(self.folder)
        answer = run("measure", self.session, "--out", out, "--plots", "none")
        self.assertEqual(answer.returncode, 5, answer.stderr)
        self.assertEqual(len(answer.stderr.splitlines()), 1, answer.stderr)
        self.assertIn(str(named or out), answer.stderr)
        self.assertEqual(files_below(self.folder), before)

    def accept(self, out):
        answer = run("measure", self.session, "--out", out, "--plots", "none")
        self.assertEqual(answer.returncode, 0, answer.stderr)
        self.assertEqual(files_below(out), TABLES)
        self.assertEqual([p.name for p in pathlib.Path(out).parent.iterdir() if "partial" in p.name], [])

    def test_a_new_and_an_empty_folder_are_taken(self):
        self.accept(self.out)
        (self.folder / "empty").mkdir()
        self.accept(self.folder / "empty")

    def test_parents_of_a_new_folder_are_made(self):
        self.accept(self.folder / "2026" / "11" / "out")

    def test_an_output_of_ours_is_replaced_as_a_whole(self):
        self.accept(self.out)
        (self.out / "quantities.csv").write_text("stale\n", encoding="utf-8")
        self.accept(self.out)
        self.assertNotEqual((self.out / "quantities.csv").read_text(encoding="utf-8"), "stale\n")

    def test_a_run_that_fails_leaves_the_old_output_as_it_was(self):
        self.accept(self.out)
        before = (self.out / "result.json").read_bytes()
        edit(self.session, "flat_low.tif", "gone.tif")
        self.assertEqual(run("measure", self.session, "--out", self.out).returncode, 3)
        self.assertEqual((self.out / "result.json").read_bytes(), before)
        self.assertEqual(sorted(path.name for path in self.folder.iterdir()), ["in", "out"])

    def test_a_folder_of_someone_else_is_refused(self):
        self.out.mkdir()
        (self.out / "thesis.txt").write_text("years of work", encoding="utf-8")
        self.refuse(self.out)

    def test_a_folder_with_a_foreign_result_json_is_refused(self):
        self.out.mkdir()
        (self.out / "result.json").write_text('{"schema": "other/1"}', encoding="utf-8")
        self.refuse(self.out)

    def test_the_folder_of_the_frames_is_refused(self):
        self.refuse(self.folder / "in")

    def test_a_file_in_the_way_is_refused(self):
        self.out.write_text("a file", encoding="utf-8")
        self.refuse(self.out)

    def test_a_folder_below_a_file_is_refused(self):
        (self.folder / "file").write_text("a file", encoding="utf-8")
        self.refuse(self.folder / "file" / "out", named=self.folder / "file")

    def test_a_place_where_nothing_can_be_made_is_refused(self):
        self.refuse("/proc/evenfield_out")


def find_number(tree, name):
    """The first number under `name` in nested tables and lists."""
    if isinstance(tree, dict):
        if isinstance(tree.get(name), (int, float)):
            return tree[name]
        tree = list(tree.values())
    if isinstance(tree, list):
        found = [find_number(item, name) for item in tree]
        return next((number for number in found if number is not None), None)
    return None


def on_terminal(command, environment):
    """What `command` writes when its standard error and output are a terminal."""
    leader, follower = pty.openpty()
    process = subprocess.Popen(command, stdout=follower, stderr=follower, stdin=subprocess.DEVNULL, env=environment)
    os.close(follower)
    text = b""
    while True:
        try:
            part = os.read(leader, 65536)
        except OSError:  # Linux's end of file on a terminal whose other end is closed
            break
        if not part:
            break
        text += part
    process.wait(timeout=60)
    os.close(leader)
    return text.decode("utf-8", "replace")


if __name__ == "__main__":
    unittest.main()
