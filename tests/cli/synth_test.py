"""evenfield synth: the same bytes every time, a session that can be measured, and refusals."""
import json
import pathlib
import tempfile
import unittest

from sessions import ROOT, files_below, run

SCENE = ROOT / "sample_frames" / "scene.toml"


class Synth(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)

    def synth(self, out, *arguments):
        answer = run("synth", SCENE, "--out", self.folder / out, *arguments)
        self.assertEqual(answer.returncode, 0, answer.stderr)
        return self.folder / out

    def test_twice_and_with_one_or_three_threads_the_bytes_are_the_same(self):
        first = self.synth("first", "--threads", "1")
        second = self.synth("second", "--threads", "3")
        self.assertEqual(files_below(first), files_below(second))
        self.assertIn("truth.json", files_below(first))
        for name in files_below(first):
            self.assertEqual((first / name).read_bytes(), (second / name).read_bytes(), name)

    def test_its_session_can_be_measured(self):
        out = self.synth("made")
        answer = run("measure", out / "session.toml", "--out", self.folder / "result", "--plots", "none")
        self.assertEqual(answer.returncode, 0, answer.stderr)
        truth = json.loads((out / "truth.json").read_text(encoding="utf-8"))
        self.assertEqual(truth["schema"], "evenfield.truth/1")

    def test_its_own_output_is_replaced_and_any_other_folder_refused(self):
        made = self.synth("made")
        self.synth("made")
        other = self.folder / "other"
        other.mkdir()
        (other / "note.txt").write_text("keep", encoding="utf-8")
        answer = run("synth", SCENE, "--out", other)
        self.assertEqual(answer.returncode, 5, answer.stderr)
        self.assertEqual(len(answer.stderr.splitlines()), 1, answer.stderr)
        self.assertEqual(files_below(other), ["note.txt"])
        self.assertEqual(sorted(p.name for p in self.folder.iterdir()), ["made", "other"])
        self.assertTrue((made / "session.toml").is_file())

    def test_a_bad_scene_is_status_3_and_one_line_with_its_place(self):
        text = SCENE.read_text(encoding="utf-8")
        self.assertIn("schema = 1", text)
        for name, broken, expected in [
            ("unknown key", text.replace("schema = 1", "schema = 1\nsede = 3", 1), r"sede"),
            ("other schema", text.replace("schema = 1", "schema = 9", 1), r"schema.*found 9.*expected"),
            ("no TOML", "[[[\n" + text, r"line 1"),
        ]:
            with self.subTest(name):
                scene = self.folder / "scene.toml"
                scene.write_text(broken, encoding="utf-8")
                answer = run("synth", scene, "--out", self.folder / "out")
                self.assertEqual((answer.returncode, answer.stdout), (3, ""), answer.stderr)
                self.assertEqual(len(answer.stderr.splitlines()), 1, answer.stderr)
                self.assertRegex(answer.stderr, r"scene\.toml, line \d+")
                self.assertRegex(answer.stderr, expected)
                self.assertFalse((self.folder / "out").exists())

    def test_a_missing_scene_is_status_3(self):
        answer = run("synth", self.folder / "gone.toml", "--out", self.folder / "out")
        self.assertEqual(answer.returncode, 3, answer.stderr)
        self.assertRegex(answer.stderr, r"gone\.toml.*found")


if __name__ == "__main__":
    unittest.main()
