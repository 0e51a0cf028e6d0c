"""README.md holds what the program does: its quantities, its session example, its paths and its commands."""
import pathlib
import re
import sys
import tempfile
import unittest

import numpy

ROOT = pathlib.Path(__file__).resolve().parents[2]
sys.path.insert(0, str(ROOT / "tests" / "cli"))
from sessions import frames, run, write_tiff  # noqa: E402

README = (ROOT / "README.md").read_text(encoding="utf-8")
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")


class Readme(unittest.TestCase):
    def test_its_table_lists_every_quantity_in_the_order_and_unit_of_the_program(self):
        source = (ROOT / "lib" / "result" / "quantity_table.cpp").read_text(encoding="utf-8")
        table = re.findall(r'QuantityInfo\{\s*"(\w+)",\s*"([^"]*)"', source)
        self.assertGreater(len(table), 10)
        listed = []
        for names, units in re.findall(r"(?m)^\| ((?:`\w+`(?:, )?)+) \| ([^|]+) \|", README[README.index("| quantity |"):]):
            listed += zip(re.findall(r"`(\w+)`", names), units.strip().split(", "))
        self.assertEqual(listed, table)

    def test_its_session_example_can_be_measured(self):
        example = re.search(r"```toml\n(schema = 1.*?)```", README, re.S)[1]
        generator = numpy.random.default_rng(7)
        with tempfile.TemporaryDirectory() as folder:
            for name, mean_e in {"bias": 0, "dark_100ms_*": 0, "flat_010ms_*": 300, "flat_100ms_*": 3000}.items():
                self.assertIn(f'files = ["{name}.tif"]', example)
                if "*" not in name:
                    write_tiff(f"{folder}/{name}.tif", frames(mean_e, 6, generator))
                    continue
                for number in range(4):
                    write_tiff(f"{folder}/{name.replace('*', str(number))}.tif", frames(mean_e, 1, generator)[0])
            session = pathlib.Path(folder, "session.toml")
            session.write_text(example, encoding="utf-8")
            answer = run("measure", session, "--out", f"{folder}/result", "--plots", "none")
            self.assertEqual(answer.returncode, 0, answer.stderr)

    def test_every_option_it_shows_for_measure_exists(self):
        known = run("measure", "--help").stdout
        for option in ("--out", "--threads", "--plots", "--camera", "--json", "--quiet"):
            self.assertIn(option, README)
            self.assertIn(option, known)

    def test_every_path_of_the_tree_that_the_documents_name_is_there(self):
        paths = set(re.findall(r"(?<![\w/])((?:scripts|lib|tests|tools|sample_frames)/[\w./]*\w/?)", README + DEVELOPERS))
        self.assertGreater(len(paths), 15)
        for path in paths:
            with self.subTest(path):
                self.assertTrue((ROOT / path).exists())


if __name__ == "__main__":
    unittest.main()
