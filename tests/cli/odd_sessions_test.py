"""Sessions that are wrong or odd in ways a person makes them: the program says so, and states no number that it cannot stand for."""
import json
import pathlib
import tempfile
import unittest

import numpy

from sessions import GAIN_DN_PER_E, OFFSET_DN, SERIES, edit, frames, good_session, run, write_tiff

LEVELS = {0.01: 500, 0.02: 1000, 0.03: 1500, 0.04: 2000, 0.05: 2500, 0.06: 3000, 0.07: 3500}


def levels_session(folder, change=lambda stack: stack, top=None, bit_depth=12):
    """Flats of LEVELS and one past saturation, eight bias frames and eight darks, each stack changed by `change`."""
    generator = numpy.random.default_rng(7)
    text = f"schema = 1\n\n[camera]\nbit_depth = {bit_depth}\n"
    stacks = {f"flat_{number}": ("flat", exposure, mean) for number, (exposure, mean) in enumerate(LEVELS.items())}
    stacks |= {"flat_top": ("flat", 0.2, 10000), "bias": ("bias", 0.0, 0), "dark": ("dark", 0.05, 0)}
    for name, (kind, exposure, mean_e) in stacks.items():
        stack = frames(mean_e, 8 if kind != "flat" else 4, generator)
        stack = numpy.minimum(stack, 4095) if top is None else numpy.minimum(stack, top)
        write_tiff(pathlib.Path(folder, f"{name}.tif"), change(stack))
        text += SERIES.format(kind=kind, exposure=exposure, files=f"{name}.tif")
    session = pathlib.Path(folder, "session.toml")
    session.write_text(text, encoding="utf-8")
    return session


class OddSessions(unittest.TestCase):
    def setUp(self):
        self.folder = tempfile.TemporaryDirectory()
        self.addCleanup(self.folder.cleanup)

    def measured(self, session):
        out = pathlib.Path(self.folder.name, "result")
        answer = run("measure", session, "--out", out, "--plots", "none", "--quiet")
        self.assertEqual(answer.returncode, 0, answer.stderr)
        result = json.loads((out / "result.json").read_text(encoding="utf-8"))
        return {q["name"]: q for q in result["quantities"]}, {f["code"]: f for f in result["findings"]}

    def test_codes_below_zero_saturate_as_those_above_do(self):
        plain, _ = self.measured(levels_session(self.folder.name))
        moved, _ = self.measured(levels_session(self.folder.name, lambda s: (s.astype(numpy.int32) - 32768).astype(numpy.int16)))
        for name in ("saturation_dn", "saturation_capacity_e", "dynamic_range_db", "conversion_gain_dn_per_e", "linearity_error_percent"):
            self.assertAlmostEqual(moved[name]["value"], plain[name]["value"], delta=1e-9 * plain[name]["value"])
        self.assertIn("converter-limited", moved["full_well_e"]["note"])

    def test_every_pixel_type_gives_the_same_numbers(self):
        plain, _ = self.measured(levels_session(self.folder.name))
        for kind in (numpy.int32, numpy.uint32, numpy.float32, numpy.float64):
            other, _ = self.measured(levels_session(self.folder.name, lambda s, kind=kind: s.astype(kind)))
            for name, quantity in plain.items():
                with self.subTest(name, kind=kind):
                    if quantity["value"] is None:
                        self.assertIsNone(other[name]["value"])
                    else:
                        self.assertAlmostEqual(other[name]["value"], quantity["value"], delta=1e-9 * abs(quantity["value"]) + 1e-12)

    def test_exchanged_exposures_are_a_problem(self):
        session = levels_session(self.folder.name)
        text = session.read_text(encoding="utf-8")
        text = text.replace("exposure_s = 0.02\n", "exposure_s = 0.99\n").replace("exposure_s = 0.06\n", "exposure_s = 0.02\n")
        session.write_text(text.replace("exposure_s = 0.99\n", "exposure_s = 0.06\n"), encoding="utf-8")
        quantities, findings = self.measured(session)
        self.assertEqual(findings["exposure-mismatch"]["severity"], "problem")
        self.assertIsNone(quantities["full_well_e"]["value"])
        # The gain needs no exposures: four standard uncertainties.
        gain = quantities["conversion_gain_dn_per_e"]
        self.assertLess(abs(gain["value"] - GAIN_DN_PER_E), 4 * gain["standard_uncertainty"])

    def test_a_signal_that_falls_with_exposure_has_no_linearity(self):
        session = levels_session(self.folder.name)
        text = session.read_text(encoding="utf-8")
        for number, exposure in enumerate(LEVELS):
            text = text.replace(f'exposure_s = {exposure}\nfiles = ["flat_{number}.tif"]', f'exposure_s = {0.09 - exposure:.2f}\nfiles = ["flat_{number}.tif"]')
        session.write_text(text, encoding="utf-8")
        quantities, _ = self.measured(session)
        self.assertIsNone(quantities["linearity_error_percent"]["value"])
        self.assertIsNone(quantities["full_well_e"]["value"])

    def test_darks_cut_off_at_the_top_code_are_a_problem(self):
        _, findings = self.measured(levels_session(self.folder.name, top=int(OFFSET_DN) + 2, bit_depth=8))
        self.assertEqual(findings["clipped-dark"]["severity"], "problem")

    def test_flats_that_are_all_saturated_are_a_problem_that_names_the_gain(self):
        session = good_session(self.folder.name)
        for name in ("low", "middle", "high"):
            write_tiff(pathlib.Path(self.folder.name, f"flat_{name}.tif"), numpy.full((4, 40, 48), 65535, numpy.uint16))
        quantities, findings = self.measured(session)
        self.assertIsNone(quantities["conversion_gain_dn_per_e"]["value"])
        self.assertEqual(findings["too-few-levels"]["severity"], "problem")
        for quantity in quantities.values():
            if quantity["value"] is None:
                self.assertTrue(quantity["note"], quantity["name"])
                if "lower limit is" in quantity["note"]:
                    self.assertIsNotNone(quantity["low95"], quantity["name"])
                if "upper limit is" in quantity["note"]:
                    self.assertIsNotNone(quantity["high95"], quantity["name"])

    def test_no_light_is_said_as_such(self):
        session = levels_session(self.folder.name)
        edit(session, "bit_depth = 12\n", "bit_depth = 12\npixel_pitch_um = 6.5\n\n[light]\nwavelength_nm = 530\nirradiance_w_per_m2 = 1e-300\n")
        quantities, _ = self.measured(session)
        self.assertIsNone(quantities["quantum_efficiency_percent"]["value"])


if __name__ == "__main__":
    unittest.main()
