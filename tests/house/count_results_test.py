"""scripts/count_results: the closing line of scripts/test from logs as ctest, doctest and unittest write them."""
import pathlib
import subprocess
import tempfile
import unittest

SCRIPT = pathlib.Path(__file__).resolve().parents[2] / "scripts" / "count_results"

DOCTEST_GOOD = """\
1: [doctest] test cases:  3 |  3 passed | 0 failed | 2 skipped
1: [doctest] assertions: 10 | 10 passed | 0 failed |
1: [doctest] Status: SUCCESS!
1/2 Test #1: base .............................   Passed    0.02 sec
"""
DOCTEST_BAD = """\
2: [doctest] test cases: 12 | 10 passed | 2 failed | 0 skipped
2/2 Test #2: model ............................***Failed    0.10 sec
"""
CRASH = "3/3 Test #3: ingest/session ..................***Exception: SegFault  0.10 sec\n"
TIME_OUT = "3/3 Test #3: ingest ..................***Timeout  600.10 sec\n"
LEAK = """\
4: [doctest] test cases: 5 | 5 passed | 0 failed | 0 skipped
4/4 Test #4: formats ...........................***Failed    0.10 sec
"""
NO_CASE = """\
5: [doctest] test cases: 0 | 0 passed | 0 failed | 4 skipped
5/5 Test #5: result ...........................   Passed    0.10 sec
"""
PLAIN = "6/6 Test  #6: house_includes ...................   Passed    0.10 sec\n"
SCRIPT_GOOD = """\
7: Ran 4 tests in 2.102s
7:
7: OK (skipped=1)
7/7 Test #7: cli/errors .......................   Passed    2.10 sec
"""
SCRIPT_BAD = """\
8: Ran 4 tests in 2.102s
8:
8: FAILED (failures=1, errors=1)
8/8 Test #8: cli/errors .......................***Failed    2.10 sec
"""

# name of the row, log, what is printed last, exit status
ROWS = [
    ("cases of a passing executable count each", DOCTEST_GOOD, "3 passed, 0 failed", 0),
    ("failed cases count each", DOCTEST_GOOD + DOCTEST_BAD, "13 passed, 2 failed", 1),
    ("a crash is a failed case", DOCTEST_GOOD + CRASH, "3 passed, 1 failed", 1),
    ("a time-out is a failed case", DOCTEST_GOOD + TIME_OUT, "3 passed, 1 failed", 1),
    ("a failure after all cases passed is one", LEAK, "4 passed, 1 failed", 1),
    ("an executable without a case has failed", DOCTEST_GOOD + NO_CASE, "3 passed, 1 failed", 1),
    ("an entry that reports no cases is one", PLAIN, "1 passed, 0 failed", 0),
    ("unittest cases count each, skipped ones not", SCRIPT_GOOD, "3 passed, 0 failed", 0),
    ("unittest failures and errors count", SCRIPT_BAD, "2 passed, 2 failed", 1),
    ("failed subtests are no more than the cases", SCRIPT_BAD.replace("=1", "=9"), "0 passed, 4 failed", 1),
    ("counts do not leak into the next entry", DOCTEST_BAD + PLAIN + SCRIPT_GOOD, "14 passed, 2 failed", 1),
    ("an empty log is no success", "", "0 passed, 0 failed", 1),
]


class CountResults(unittest.TestCase):
    def test_each_row_gives_its_closing_line_and_status(self):
        for name, log, line, status in ROWS:
            with self.subTest(name), tempfile.NamedTemporaryFile("w", suffix=".log") as file:
                file.write(log)
                file.flush()
                run = subprocess.run([SCRIPT, file.name], capture_output=True, text=True, check=False)
                self.assertEqual((run.stdout.splitlines()[-1], run.returncode), (line, status))

    def test_several_logs_add_up_and_failed_entries_are_named(self):
        with tempfile.NamedTemporaryFile("w") as one, tempfile.NamedTemporaryFile("w") as two:
            one.write(DOCTEST_GOOD)
            two.write(CRASH)
            one.flush()
            two.flush()
            run = subprocess.run([SCRIPT, one.name, two.name], capture_output=True, text=True, check=False)
        self.assertEqual(run.stdout.splitlines(), [
            CRASH.rstrip("\n"), f"failed: ingest/session (all of its output is in {two.name})", "3 passed, 1 failed"])


if __name__ == "__main__":
    unittest.main()
