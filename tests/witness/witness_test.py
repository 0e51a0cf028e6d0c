"""The program's numbers against a second implementation that shares nothing with it, on three sessions."""
import copy
import json
import os
import pathlib
import subprocess
import tempfile
import unittest

import numpy

import comparison
import lines
import scenes
import stacks
import witness

ROOT = pathlib.Path(__file__).resolve().parents[2]
PROGRAM = os.environ.get("EVENFIELD_PROGRAM", str(ROOT / "build" / "release" / "bin" / "evenfield"))
FEWEST_QUANTITIES = 12


def run(*arguments):
    answer = subprocess.run([PROGRAM, *map(str, arguments)], capture_output=True, text=True, timeout=300, check=False)
    if answer.returncode:
        raise AssertionError(f"{' '.join(map(str, arguments))} ended with {answer.returncode}: {answer.stderr}")


class ProgramAndWitness(unittest.TestCase):
    def setUp(self):
        scratch = tempfile.TemporaryDirectory()
        self.addCleanup(scratch.cleanup)
        self.folder = pathlib.Path(scratch.name)

    def made(self, scene):
        (self.folder / "scene.toml").write_text(scene, encoding="utf-8")
        run("synth", self.folder / "scene.toml", "--out", self.folder / "made")
        return self.folder / "made" / "session.toml"

    def both(self, session):
        run("measure", session, "--out", self.folder / "result", "--plots", "none", "--quiet")
        result = json.loads((self.folder / "result" / "result.json").read_text(encoding="utf-8"))
        return result, witness.measure(session)

    def agree(self, session):
        result, own = self.both(session)
        found = list(comparison.compare(result, own))
        for line in found:
            print(line)
        listed = {quantity["name"] for quantity in result["quantities"]}
        names = {line.name for line in found if line.compared and line.name in listed}
        print(f"{len(names)} quantities and {sum(line.compared for line in found)} numbers compared\n")
        self.assertGreaterEqual(len(names), FEWEST_QUANTITIES)
        self.assertEqual([str(line) for line in found if not line.agrees], [])
        self.assertEqual(list(comparison.contradictions(result)), [])

    def test_they_agree_on_a_ccd_of_two_outputs_under_drifting_light(self):
        self.agree(self.made(scenes.CCD))

    def test_they_agree_on_a_cmos_sensor_with_row_noise_whose_codes_stand_in_the_high_bits(self):
        self.agree(self.made(scenes.CMOS))

    def test_they_agree_on_the_sample_session(self):
        self.agree(ROOT / "sample_frames" / "tiff" / "session.toml")

    def test_the_pattern_of_dark_current_in_long_flats_is_no_photo_response(self):
        found = [line for line in comparison.compare(*self.both(self.made(scenes.CCD_OF_LONG_FLATS)))
                 if line.name.startswith("prnu_") and line.compared]
        for line in found:
            print(line)
        self.assertEqual(len(found), 10)  # total, rows, columns, pixels, high-pass, of two regions
        self.assertEqual([str(line) for line in found if not line.agrees], [])

    def test_a_number_that_is_wrong_beyond_its_tolerance_is_found(self):
        result, own = self.both(ROOT / "sample_frames" / "tiff" / "session.toml")

        def disagreeing(one):
            return {line.name for line in comparison.compare(one, own) if not line.agrees}

        before = disagreeing(result)
        for name, factor in (("conversion_gain_dn_per_e", 1.001), ("prnu_percent", 1.001), ("saturation_dn", 1.004)):
            wrong = copy.deepcopy(result)
            quantity = next(one for one in wrong["quantities"] if one["name"] == name)
            quantity["value"] *= factor
            with self.subTest(name):
                self.assertEqual(disagreeing(wrong) - before, {name})
                if name != "prnu_percent":
                    self.assertTrue(list(comparison.contradictions(wrong)))
        wrong = copy.deepcopy(result)
        wrong["series"][5]["variance_dn2"] *= 1.00001
        self.assertEqual(disagreeing(wrong) - before, {"variance_dn2 of flat flat_02.tif"})


class Witness(unittest.TestCase):
    """The witness itself against the check values of METHODS; the identifiers are those of its table."""

    def test_its_line_is_that_of_maximum_likelihood(self):  # PF-01
        intercept, slope = lines.likelihood_line([0, 100, 200, 400, 800], [1.1, 51, 103, 199, 405], [10000] * 5)
        self.assertAlmostEqual(slope, 0.50203936806745, 11)
        self.assertAlmostEqual(intercept, 1.09996591136211, 11)

    def test_its_curve_is_the_exponential_form_and_is_found_again(self):  # BF-01
        variance = lines.curve(numpy.array([25000.0]), 25 / 4, 0.5, -2.4e-6)
        self.assertAlmostEqual(variance[0], 11119.382236, 5)
        x = numpy.linspace(0, 40000, 9)
        _, gain, curvature, _ = lines.likelihood_curve(x, lines.curve(x, 25 / 4, 0.5, -2.4e-6), [1e6] * 9)
        self.assertAlmostEqual(gain, 0.5, 9)
        self.assertAlmostEqual(curvature, -2.4e-6, 12)

    def test_its_variance_of_three_frames_is_unbiased_and_free_of_drift(self):  # PT-03
        frames = numpy.array([[10, 12, 11, 15], [12, 11, 14, 17], [11, 14, 12, 14]], float).reshape(3, 2, 2)
        self.assertAlmostEqual(stacks.temporal_variance(frames, 0), 1.9166667, 7)

    def test_light_that_only_changes_in_strength_has_no_variance(self):
        image = numpy.arange(100.0, 164.0).reshape(8, 8)
        frames = numpy.stack([50 + scale * image for scale in (0.97, 1.0, 1.03)])
        self.assertAlmostEqual(stacks.temporal_variance(frames, 0, 50.0), 0.0, 18)

    def test_its_parts_of_a_pattern_are_those_of_the_analysis_of_variance(self):  # SP-03, the 4 x 5 image of METHODS 5.2
        row, column = numpy.array([1, -1, 2, -2.0]), numpy.array([3, -1, 0, -2, 0.0])
        pixel = numpy.array([[1, -1, 0, 0, 0], [-1, 1, 0, 0, 0], [0, 0, 1, -1, 0], [0, 0, -1, 1, 0.0]])
        parts = stacks.row_column_pixel(100 + row[:, None] + column + pixel)
        for part, expected in zip(parts, (3.2, 10 / 3, 2 / 3)):
            self.assertAlmostEqual(part, expected, 12)

    def test_its_high_pass_leaves_the_published_share_of_white_noise(self):  # SP-05
        image = numpy.zeros((37, 37))
        image[18, 18] = 1.0
        self.assertAlmostEqual(numpy.sum(stacks.high_pass(image) ** 2), stacks.HIGHPASS_NOISE_GAIN, 9)


if __name__ == "__main__":
    unittest.main(verbosity=1)
