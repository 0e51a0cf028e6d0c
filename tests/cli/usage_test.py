"""The command line itself: help, version, and exit status 2 for what is wrong with it."""
import os
import pathlib
import re
import subprocess
import tempfile
import unittest

from sessions import PROGRAM, ROOT, good_session, run

# name, arguments ({session} and {out} are filled in), what the one line on standard error must hold
WRONG = [
    ("an unknown command", ["mesure", "{session}"], "mesure.*measure"),
    ("an unknown option of the program", ["--nonsense"], "nonsense"),
    ("measure without anything", ["measure"], "session"),
    ("measure without an output folder", ["measure", "{session}"], "--out"),
    ("measure with an unknown option", ["measure", "{session}", "--out", "{out}", "--nonsense"], "nonsense"),
    ("an option without its value", ["measure", "{session}", "--out"], "out"),
    ("a number of threads that is a word", ["measure", "{session}", "--out", "{out}", "--threads", "many"], "threads"),
    ("no threads at all", ["measure", "{session}", "--out", "{out}", "--threads", "0"], "threads"),
    ("fewer threads than none", ["measure", "{session}", "--out", "{out}", "--threads", "-2"], "threads"),
    ("a plot that does not exist", ["measure", "{session}", "--out", "{out}", "--plots", "portrait"], "portrait"),
    ("synth without anything", ["synth"], "scene|SCENE"),
    ("synth without an output folder", ["synth", "scene.toml"], "--out"),
]


class Usage(unittest.TestCase):
    def test_a_wrong_command_line_ends_with_status_2_and_one_line(self):
        with tempfile.TemporaryDirectory() as folder:
            session = good_session(pathlib.Path(folder, "in"))
            for name, arguments, expected in WRONG:
                with self.subTest(name):
                    answer = run(*[a.format(session=session, out=f"{folder}/out") for a in arguments])
                    self.assertEqual((answer.returncode, answer.stdout), (2, ""), answer.stderr)
                    self.assertEqual(len(answer.stderr.splitlines()), 1, answer.stderr)
                    self.assertRegex(answer.stderr, expected)
                    self.assertFalse(os.path.exists(f"{folder}/out"))

    def test_no_command_at_all_is_status_2_and_shows_the_help(self):
        answer = run()
        self.assertEqual((answer.returncode, answer.stdout), (2, ""))
        self.assertEqual(answer.stderr, run("--help").stdout)

    def test_help_of_the_program_names_every_command(self):
        answer = run("--help")
        self.assertEqual((answer.returncode, answer.stderr), (0, ""))
        for command in ("measure", "synth"):
            self.assertRegex(answer.stdout, rf"(?m)^\s+{command}\b")
        self.assertLessEqual(max(map(len, answer.stdout.splitlines())), 100)

    def test_help_of_each_command_names_its_options(self):
        for command, options in {"measure": ["--out", "--threads", "--quiet", "--json", "--plots", "--progress", "--help"],
                                 "synth": ["--out", "--threads", "--quiet", "--help"]}.items():
            with self.subTest(command):
                answer = run(command, "--help")
                self.assertEqual((answer.returncode, answer.stderr), (0, ""))
                for option in options:
                    self.assertIn(option, answer.stdout)

    def test_the_version_is_that_of_the_build_file(self):
        build_file = (ROOT / "CMakeLists.txt").read_text(encoding="utf-8")
        version = re.search(r"project\(evenfield VERSION (\S+)", build_file)[1]
        for arguments in (["--version"], ["measure", "--version"]):
            with self.subTest(arguments):
                answer = run(*arguments)
                self.assertEqual((answer.returncode, answer.stdout), (0, f"evenfield {version}\n"), answer.stderr)

    def test_a_result_that_cannot_be_printed_is_status_5(self):
        with open("/dev/full", "w", encoding="utf-8") as full:
            status = subprocess.run([PROGRAM, "--help"], stdout=full, stderr=subprocess.PIPE, check=False).returncode
        self.assertEqual(status, 5)


if __name__ == "__main__":
    unittest.main()
